"""Layers of spatial files as columns of text and geometries, by way of GDAL.

A row is numbered by its place in the layer, from 1, as an attribute table shows it unsorted.
"""

from __future__ import annotations

import re
import warnings
from collections.abc import Callable, Collection, Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt
import pandas as pd

from geomap.errors import InputError, problem
from geomap.readers.cell_text import text_from_value
from geomap.readers.files import reason
from geomap.readers.heading_rows import fit, mapping
from geomap.readers.options import TableOptions
from geomap.readers.raw_tables import ROW_INDEX, raw_table, with_conventions
from geomap.readers.sheets import Place, chosen_part
from geomap.readers.spatial_files import GEOJSON_SUFFIXES
from geomap.readers.table_headings import resolve, unread
from geomap.tables import schema
from geomap.tables.findings import Check, together
from geomap.tables.raw import Heading, RawTable
from geomap.tables.schema import Layout

GEOMETRY = "geometry"  # name of the column of `original` that holds it as well-known text
DECIMALS = 9  # of coordinates in well-known text: a tenth of a millimeter in degrees
POINT, MULTI_POINT = 0, 4  # type numbers of shapely
SHOWN = 5

_MIDNIGHT = re.compile(r"T00:00:00(?:\.0+)?(?:Z|[+-]\d\d:?\d\d)?$")
_NO_CRS = re.compile(r"\W*(?:ENGCRS|LOCAL_CS|GEOGCRS|GEOGCS)\[\"Undefined", re.IGNORECASE)

NOT_DEGREES = Check(
    "coordinates not in degrees",
    "query",
    "longitude and latitude, as RFC 7946 has it, where no crs is stated",
    "taken in the coordinate system of the corridor; state the crs",
)
ATTRIBUTE_COORDINATES = Check(
    "coordinates twice", "accept", "the geometry of the layer", "the geometry was used, not this column"
)
LEVELS_IN_GEOMETRY = Check(
    "levels in the geometry", "accept", "levels in a column", "not read; put ground levels in a column"
)


@dataclass(frozen=True)
class Layer:
    """One layer of a spatial file.

    Attributes
    ----------
    file, name
        Name of the file (no folder) and of the layer; ``name`` is blank where the format has one layer only.
    fields
        Attributes as text, as found; the index is the row number.
    geometry
        One shapely geometry, or None, for each row; None where the layer has no geometry at all.
    crs
        Coordinate system as an authority code, else as well-known text; blank where the file states none.
    findings
        What was noticed about it.
    """

    file: str
    name: str
    fields: pd.DataFrame
    geometry: npt.NDArray[np.object_] | None
    crs: str
    findings: pd.DataFrame = field(default_factory=pd.DataFrame)


def read_table(path: Path, layout: str, options: TableOptions, has_layers: bool = False) -> RawTable:
    """Return a layer as a table; x and y come from its points where the layout has them.

    Parameters
    ----------
    path, layout, options
        The file, the name of the input layout, and what the corridor file says about it.
    has_layers
        The format has several layers: the table then names its layer as ``sheet``.

    Raises
    ------
    InputError
        The file or its geometry cannot be used, required headings are missing, or it is open which layer is meant.
    UsageError
        There is no layer, or no heading, of the name given.
    """
    wanted = schema.inputs()[layout]
    mapped = mapping(wanted, options, path.name)
    place_columns = [name for name in ("x", "y") if name in wanted.columns and name not in mapped]

    def how_well(info: Mapping[str, Any]) -> tuple[int, ...]:
        given = place_columns if "Point" in str(info["geometry_type"]) else []
        is_whole, count, _ = fit([[str(name) for name in info["fields"]]], wanted, options, given)
        return int(is_whole), count + len(given)

    layer = read_layer(path, options, wanted, how_well, has_layers)
    given = place_columns if layer.geometry is not None else []
    place = Place(layer.file, layer.name)
    labels = [str(name) for name in layer.fields.columns]
    headings = resolve(labels, wanted, options, place, given=given)
    original = layer.fields.set_axis(list(headings.labels), axis="columns")
    notes = [layer.findings, headings.findings, unread(headings, wanted, place, given)]
    table = raw_table(original, wanted, headings, place, notes, layer.crs)
    table = with_conventions(table, delimiter="")
    if layer.geometry is None:
        return table
    if given:
        table = _with_points(table, layer.geometry, given, _aliases(headings.unrecognized, wanted, given), place)
    return replace(table, original=_with_text_of_geometry(table.original, layer.geometry))


def read_layer(
    path: Path,
    options: TableOptions,
    layout: Layout,
    how_well: Callable[[Mapping[str, Any]], tuple[int, ...]],
    has_layers: bool = False,
) -> Layer:
    """Return one layer: the one named, the only one, or the only one that fits.

    Parameters
    ----------
    path, options
        The file, and what the corridor file says about it.
    layout
        The table that is wanted, for the choice and its message.
    how_well
        From what GDAL says about a layer (``fields``, ``geometry_type``), how well it fits; first number 1 if wholly.
    has_layers
        As in :func:`read_table`.
    """
    import pyogrio
    import shapely

    titles = _asked(path, lambda: [str(item[0]) for item in pyogrio.list_layers(path)])
    wanted = options.layer or options.sheet if has_layers else ""
    fits = {}
    if not wanted and len(titles) > 1:
        infos = _asked(path, lambda: {title: pyogrio.read_info(path, layer=title) for title in titles})
        fits = {title: how_well(info) for title, info in infos.items()}
    chosen = chosen_part("layer", path.name, titles, wanted, fits, layout)
    meta, _, wkb, columns = _asked(path, lambda: pyogrio.raw.read(path, layer=chosen, datetime_as_string=True))
    types = meta.get("ogr_types") or [""] * len(columns)
    count = len(wkb) if wkb is not None else len(columns[0]) if columns else 0
    index = pd.RangeIndex(1, count + 1, name=ROW_INDEX)
    texts = [_texts(column, str(kind), index) for column, kind in zip(columns, types, strict=True)]
    fields = pd.concat(texts, axis="columns") if texts else pd.DataFrame(index=index)
    fields.columns = pd.Index([str(name) for name in meta["fields"]], dtype=object)
    has_geometry = wkb is not None and meta["geometry_type"] is not None
    geometry = _asked(path, lambda: shapely.from_wkb(wkb)) if has_geometry else None
    layer = Layer(path.name, chosen if has_layers else "", fields, geometry, crs_text(meta["crs"]))
    return _with_plausible_crs(layer) if path.suffix.lower() in GEOJSON_SUFFIXES else layer


def _asked(path: Path, question: Callable[[], Any]) -> Any:
    """Return the answer of GDAL, or raise what the user can do about there being none."""
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # fields that GDAL renames or narrows: the text shows what came of it
            return question()
    except MemoryError:
        raise
    except Exception as error:  # GDAL and GEOS have error classes of their own, by version
        remedy = f"copy it again with all its parts, or save it again in a GIS ({reason(error, path)})"
        raise InputError(problem(path.name, "a file that cannot be read", "a spatial layer", remedy)) from None


def _texts(column: npt.NDArray[Any], kind: str, index: pd.Index) -> pd.Series:
    texts = pd.Series([text_from_value(value) for value in column], index, dtype="string")
    return texts.str.replace(_MIDNIGHT, "", regex=True) if kind == "OFTDateTime" else texts


def crs_text(stated: str | None) -> str:
    """Return a coordinate system as an authority code where it has one, else as it is; blank for none.

    Examples
    --------
    >>> crs_text("EPSG:32630"), crs_text(None), crs_text('ENGCRS["Undefined Cartesian SRS"]')
    ('EPSG:32630', '', '')
    """
    if not stated or _NO_CRS.match(stated):
        return ""
    import pyproj

    try:
        code = pyproj.CRS.from_user_input(stated).to_epsg()
    except pyproj.exceptions.CRSError:
        return stated
    return stated if code is None else f"EPSG:{code}"


def is_beyond_degrees(x: npt.NDArray[np.float64], y: npt.NDArray[np.float64]) -> bool:
    """Return whether any coordinate is too large for longitude or latitude."""
    return bool((np.abs(x) > 180).any() or (np.abs(y) > 90).any())


def _with_plausible_crs(layer: Layer) -> Layer:
    """Return a GeoJSON layer without its crs where that is the standing one, degrees, and coordinates are not."""
    import shapely

    if layer.crs != "EPSG:4326" or layer.geometry is None:
        return layer
    x, y = shapely.get_coordinates(layer.geometry).T
    if not is_beyond_degrees(x, y):
        return layer
    place = Place(layer.file, layer.name)
    return replace(layer, crs="", findings=NOT_DEGREES.row("", f"{x[0]:.6f}, {y[0]:.6f}", **place.columns))


def _aliases(unrecognized: Sequence[str], layout: Layout, given: Collection[str]) -> list[str]:
    """Return the headings that would have meant x or y, were there no geometry."""
    from geomap.readers.headings import Reading, reading

    read = {label: reading(label, layout) for label in unrecognized}
    return [label for label, item in read.items() if isinstance(item, Reading) and item.column in given]


def _with_points(
    table: RawTable, geometry: npt.NDArray[np.object_], given: Sequence[str], unused: Sequence[str], place: Place
) -> RawTable:
    """Return the table with x and y of its points as text; a row without a point has none."""
    import shapely

    points = geometry.copy()
    single = (shapely.get_type_id(points) == MULTI_POINT) & (shapely.get_num_geometries(points) == 1)
    points[single] = shapely.get_geometry(points[single], 0)
    is_empty = shapely.is_missing(points) | shapely.is_empty(points)
    wrong = ~is_empty & (shapely.get_type_id(points) != POINT)
    if wrong.any():
        rows = (np.flatnonzero(wrong) + 1).astype(str)
        found = (
            f"{shapely.get_type_id(points[wrong]).size} shapes that are not points, in row {', '.join(rows[:SHOWN])}"
        )
        raise InputError(problem(str(place), found, "one point for each row", "name the layer of points"))
    points[is_empty] = None
    axes = {"x": shapely.get_x(points), "y": shapely.get_y(points)}
    texts = {name: pd.Series(map(text_from_value, axes[name]), table.cells.index, dtype="string") for name in given}
    cells = table.cells.assign(**{name: column.mask(column == "") for name, column in texts.items()})
    headings = {**table.headings, **{name: Heading(GEOMETRY, name) for name in given}}
    notes = [ATTRIBUTE_COORDINATES.row(label, label, **place.columns) for label in unused]
    if shapely.has_z(points).any():
        notes.append(LEVELS_IN_GEOMETRY.row(GEOMETRY, "points with a third coordinate", **place.columns))
    return replace(table, cells=cells, headings=headings, findings=together([table.findings, *notes]))


def _with_text_of_geometry(original: pd.DataFrame, geometry: npt.NDArray[np.object_]) -> pd.DataFrame:
    """Return the columns as found and the geometry as well-known text, so that nothing of the file is lost."""
    import shapely

    name = next(name for count in range(1, 99) if (name := GEOMETRY + f"_{count}" * (count > 1)) not in original)
    texts = pd.Series(shapely.to_wkt(geometry, rounding_precision=DECIMALS), original.index, dtype="string")
    return original.assign(**{name: texts.fillna("")})
