"""One style of a layer, and the two documents that say it: SLD and QML."""

from __future__ import annotations

from dataclasses import dataclass
from xml.etree import ElementTree as ET

_SLD = "http://www.opengis.net/sld"
_SE = "http://www.opengis.net/se"
_OGC = "http://www.opengis.net/ogc"
_OUTLINE = "#1f1f1f"
_LINE_WIDTH_MM = {True: "2.4", False: "0.5"}  # a line that is told apart by color is broad
_LINE_WIDTH_PX = {True: "7", False: "1.5"}
_QGIS_VERSION = "3.22"  # written in the form of that version, which later ones read
_QGIS_GEOMETRY = {"Point": "0", "LineString": "1", "Polygon": "2"}
_QGIS_SYMBOL = {"Point": "marker", "LineString": "line", "Polygon": "fill"}
_QGIS_LAYER = {"Point": "SimpleMarker", "LineString": "SimpleLine", "Polygon": "SimpleFill"}


@dataclass(frozen=True)
class Sign:
    """How one value is drawn; a blank value stands for all the rest."""

    value: str
    label: str
    color: str


@dataclass(frozen=True)
class Style:
    """How a layer is drawn: one sign for each value of a column, or one for all if `column` is blank."""

    layer: str
    geometry: str
    name: str
    description: str
    column: str
    signs: tuple[Sign, ...]
    is_default: bool = True


def sld(style: Style) -> str:
    """Return the style as an OGC Styled Layer Descriptor 1.1.0."""
    root = ET.Element(f"{{{_SLD}}}StyledLayerDescriptor", version="1.1.0")
    layer = ET.SubElement(root, f"{{{_SLD}}}NamedLayer")
    _se(layer, "Name", style.layer)
    user = ET.SubElement(layer, f"{{{_SLD}}}UserStyle")
    _se(user, "Name", style.name)
    if style.is_default:
        ET.SubElement(user, f"{{{_SLD}}}IsDefault").text = "1"
    kind = _se(user, "FeatureTypeStyle")
    for sign in style.signs:
        rule = _se(kind, "Rule")
        _se(rule, "Name", sign.value or sign.label)
        _se(_se(rule, "Description"), "Title", sign.label)
        if style.column and sign.value:
            equal = ET.SubElement(ET.SubElement(rule, f"{{{_OGC}}}Filter"), f"{{{_OGC}}}PropertyIsEqualTo")
            ET.SubElement(equal, f"{{{_OGC}}}PropertyName").text = style.column
            ET.SubElement(equal, f"{{{_OGC}}}Literal").text = sign.value
        elif style.column:
            _se(rule, "ElseFilter")
        _symbolizer(rule, style, sign)
    for prefix, space in (("", _SLD), ("se", _SE), ("ogc", _OGC)):
        ET.register_namespace(prefix, space)
    return ET.tostring(root, encoding="unicode")


def qml(style: Style) -> str:
    """Return the style as QML, the style file of QGIS."""
    root = ET.Element("qgis", version=_QGIS_VERSION, styleCategories="Symbology")
    many = bool(style.column)
    kind = {"type": "categorizedSymbol", "attr": style.column} if many else {"type": "singleSymbol"}
    renderer = ET.SubElement(
        root, "renderer-v2", {**kind, "forceraster": "0", "symbollevels": "0", "enableorderby": "0"}
    )
    if many:
        categories = ET.SubElement(renderer, "categories")
        for number, sign in enumerate(style.signs):
            entry = {"value": sign.value, "symbol": str(number), "label": sign.label, "render": "true"}
            ET.SubElement(categories, "category", entry)
    symbols = ET.SubElement(renderer, "symbols")
    for number, sign in enumerate(style.signs):
        symbol = ET.SubElement(symbols, "symbol", type=_QGIS_SYMBOL[style.geometry], name=str(number), alpha="1")
        layer = ET.SubElement(symbol, "layer", {"class": _QGIS_LAYER[style.geometry], "enabled": "1", "pass": "0"})
        properties = _properties(style, sign)
        options = ET.SubElement(layer, "Option", type="Map")
        for name, value in properties.items():
            ET.SubElement(options, "Option", type="QString", name=name, value=value)
        for name, value in properties.items():
            ET.SubElement(layer, "prop", k=name, v=value)
    ET.SubElement(root, "layerGeometryType").text = _QGIS_GEOMETRY[style.geometry]
    doctype = "<!DOCTYPE qgis PUBLIC 'http://mrcc.com/qgis.dtd' 'SYSTEM'>"
    return f"{doctype}\n{ET.tostring(root, encoding='unicode')}"


def _properties(style: Style, sign: Sign) -> dict[str, str]:
    color, outline = _rgba(sign.color), _rgba(_OUTLINE)
    if style.geometry == "Point":
        return {"color": color, "name": "circle", "outline_color": outline, "outline_width": "0.3", "size": "2.6"}
    if style.geometry == "LineString":
        width = _LINE_WIDTH_MM[bool(style.column)]
        return {"capstyle": "flat", "line_color": color, "line_width": width, "line_width_unit": "MM"}
    return {"color": color, "outline_color": outline, "outline_style": "no", "style": "solid"}


def _symbolizer(rule: ET.Element, style: Style, sign: Sign) -> None:
    if style.geometry == "LineString":
        stroke = _se(_se(rule, "LineSymbolizer"), "Stroke")
        _parameter(stroke, "stroke", sign.color)
        _parameter(stroke, "stroke-width", _LINE_WIDTH_PX[bool(style.column)])
    elif style.geometry == "Polygon":
        _parameter(_se(_se(rule, "PolygonSymbolizer"), "Fill"), "fill", sign.color)
    else:
        graphic = _se(_se(rule, "PointSymbolizer"), "Graphic")
        mark = _se(graphic, "Mark")
        _se(mark, "WellKnownName", "circle")
        _parameter(_se(mark, "Fill"), "fill", sign.color)
        _parameter(_se(mark, "Stroke"), "stroke", _OUTLINE)
        _se(graphic, "Size", "9")


def _se(parent: ET.Element, name: str, text: str | None = None) -> ET.Element:
    child = ET.SubElement(parent, f"{{{_SE}}}{name}")
    child.text = text
    return child


def _parameter(parent: ET.Element, name: str, value: str) -> None:
    ET.SubElement(parent, f"{{{_SE}}}SvgParameter", name=name).text = value


def _rgba(color: str) -> str:
    return ",".join(str(int(color[at : at + 2], 16)) for at in (1, 3, 5)) + ",255"
