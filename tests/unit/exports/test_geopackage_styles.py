"""Every layer with a geometry has styles that fit its columns and the palette."""

from __future__ import annotations

import dataclasses
import re
import sqlite3
from collections.abc import Mapping
from contextlib import closing
from xml.etree import ElementTree as ET

import pandas as pd
import pytest

from geomap.exports import geopackage, geopackage_styles, palette
from geomap.exports.style_documents import Sign, Style, qml, sld
from geomap.results import Results
from geomap.tables import schema

SE = "{http://www.opengis.net/se}"
OGC = "{http://www.opengis.net/ogc}"
SPATIAL = [name for name, layout in schema.layers().items() if layout.geometry]


@pytest.fixture(scope="module")
def rows(results: Results, tmp_path_factory: pytest.TempPathFactory) -> list[dict[str, object]]:
    """Return the table of styles."""
    (path,) = geopackage.write(results, tmp_path_factory.mktemp("gpkg"))
    with closing(sqlite3.connect(path)) as opened:
        opened.row_factory = sqlite3.Row
        return [dict(row) for row in opened.execute("select * from layer_styles")]


@pytest.fixture(scope="module")
def styles(results: Results) -> list[Style]:
    frames = {name: geopackage.layer_frame(results, layout) for name, layout in schema.layers().items()}
    return geopackage_styles.styles(results, frames)


def parsed(document: str) -> ET.Element:
    return ET.fromstring(document)  # noqa: S314 - documents of our own


def values(document: str) -> Mapping[str, str]:
    """Return value -> color of an SLD; the rest under a blank."""
    found = {}
    for rule in parsed(document).iter(f"{SE}Rule"):
        literal = rule.find(f".//{OGC}Literal")
        painted = rule.findall(f".//{SE}SvgParameter[@name='fill']") or rule.findall(
            f".//{SE}SvgParameter[@name='stroke']"
        )
        found["" if literal is None else str(literal.text)] = str(painted[0].text)
    return found


def test_every_spatial_layer_has_exactly_one_default_style(rows: list[dict[str, object]]) -> None:
    defaults = [row["f_table_name"] for row in rows if row["useAsDefault"]]
    assert sorted(map(str, defaults)) == sorted(SPATIAL)
    assert all(row["f_geometry_column"] == "geom" for row in rows)
    assert all(len(str(row["styleName"])) <= 30 for row in rows)


def test_styles_refer_to_columns_that_exist_and_to_values_that_occur(
    rows: list[dict[str, object]], results: Results
) -> None:
    for row in rows:
        table = results.tables[str(row["f_table_name"])]
        renderer = parsed(str(row["styleQML"])).find("renderer-v2")
        assert renderer is not None
        column = renderer.get("attr")
        named = {element.text for element in parsed(str(row["styleSLD"])).iter(f"{OGC}PropertyName")}
        if column is None:
            assert not named
            continue
        assert column in table.columns
        assert named == {column}
        listed = {category.get("value") for category in renderer.iter("category")}
        assert listed == {*table[column].dropna().unique(), ""}
        assert set(values(str(row["styleSLD"]))) == listed


def test_both_documents_of_a_style_use_the_same_colors(rows: list[dict[str, object]]) -> None:
    for row in rows:
        document = parsed(str(row["styleQML"]))
        colors = [
            "#" + "".join(f"{int(part):02x}" for part in str(option.get("value")).split(",")[:3])
            for option in document.iter("Option")
            if option.get("name") in ("color", "line_color")
        ]
        assert colors == list(values(str(row["styleSLD"])).values())


def test_colors_are_those_of_the_palette(styles: list[Style]) -> None:
    by = {(style.layer, style.column): {sign.value: sign.color for sign in style.signs} for style in styles}
    assert by["profile_cells", "soil_group"]["PT"] == palette.color("astm_d2487", "PT")
    assert by["subgrade", "suitability"]["treat"] == palette.color("suitability", "treat")
    assert by["subgrade", "evidence"]["observed"] == palette.color("evidence", "observed")
    assert by["samples", "uscs_symbol"][""] == palette.NOT_DETERMINED


def test_labels_say_symbol_and_name_in_the_order_of_the_legend(styles: list[Style]) -> None:
    (style,) = [s for s in styles if (s.layer, s.column) == ("profile_cells", "soil_group")]
    assert [sign.label for sign in style.signs] == [
        "GM: silty gravel with sand",
        "SM: silty sand with gravel",
        "CL: sandy lean clay",
        "PT: peat",
        "other or none",
    ]


def test_a_corridor_of_another_system_is_colored_by_that_system(results: Results) -> None:
    other = dataclasses.replace(results, legend=results.legend.loc[results.legend["system"] != "astm_d2487"])
    frames = {name: geopackage.layer_frame(other, layout) for name, layout in schema.layers().items()}
    by = {(style.layer, style.column) for style in geopackage_styles.styles(other, frames)}
    assert ("samples", "aashto_group") in by
    assert ("samples", "uscs_symbol") not in by


def test_a_value_that_no_xml_can_hold_falls_under_the_rest(results: Results) -> None:
    subgrade = results.tables["subgrade"].assign(soil_group="bell\x07")
    other = dataclasses.replace(results, tables={**results.tables, "subgrade": subgrade})
    frames = {name: geopackage.layer_frame(other, layout) for name, layout in schema.layers().items()}
    (style,) = [s for s in geopackage_styles.styles(other, frames) if (s.layer, s.column) == ("subgrade", "soil_group")]
    assert [sign.value for sign in style.signs] == [""]
    parsed(qml(style))


@pytest.mark.parametrize("geometry", ["Point", "LineString", "Polygon"])
def test_hostile_values_stay_text_in_both_documents(geometry: str) -> None:
    word = "</se:Literal><script>alert(1)</script>&\"'"
    style = Style(
        "layer", geometry, "name", "what", "column", (Sign(word, word, "#123456"), Sign("", "rest", "#bebebe"))
    )
    assert list(values(sld(style))) == [word, ""]
    categories = [category.get("value") for category in parsed(qml(style)).iter("category")]
    assert categories == [word, ""]
    assert not re.search("<script", sld(style) + qml(style))


def test_a_layer_without_a_style_of_its_own_gets_a_plain_one(results: Results) -> None:
    frames = {name: pd.DataFrame(table) for name, table in results.tables.items()}
    (style,) = [s for s in geopackage_styles.styles(results, frames) if s.layer == "alignment"]
    assert style.column == ""
    assert len(style.signs) == 1
    renderer = parsed(qml(style)).find("renderer-v2")
    assert renderer is not None
    assert renderer.get("type") == "singleSymbol"
