"""A style for every layer with a geometry, kept in the GeoPackage.

Each style is there twice: as OGC Styled Layer Descriptor 1.1.0 (05-078r4, 05-077r4), the open standard, and as
QML, which QGIS loads by itself. The table ``layer_styles`` is where QGIS looks; it is registered as an attribute
table, as any table of a user is. Colors come from `palette`, labels from the legend.
"""

from __future__ import annotations

import sqlite3
from collections.abc import Mapping

import pandas as pd

from geomap.exports import palette
from geomap.exports.groups import SYMBOL_COLUMN, first_system, symbol_names
from geomap.exports.style_documents import Sign, Style, qml, sld
from geomap.exports.texts import stored_text
from geomap.results import Results
from geomap.tables import schema

TABLE = "layer_styles"
_CREATE = """CREATE TABLE layer_styles (
    id INTEGER PRIMARY KEY AUTOINCREMENT NOT NULL, f_table_catalog TEXT(256), f_table_schema TEXT(256),
    f_table_name TEXT(256), f_geometry_column TEXT(256), styleName TEXT(30), styleQML TEXT, styleSLD TEXT,
    useAsDefault BOOLEAN, description TEXT, owner TEXT(30), ui TEXT(30),
    update_time DATETIME DEFAULT (strftime('%Y-%m-%dT%H:%M:%fZ','now')))"""
_DESCRIPTION = "Colors of the layers, for a GIS that reads them"
_REST = "other or none"
_LINE = "#1f1f1f"

# layer -> its styles, each by one column; the first is the default
_BY_COLUMN: Mapping[str, tuple[str, ...]] = {
    "borings": ("status",),
    "samples": ("symbol", "suitability"),
    "subgrade": ("suitability", "soil_group", "evidence"),
    "profile_cells": ("soil_group", "suitability", "evidence"),
}
_STATUS_COLOR = {
    "used": palette.color("evidence", "observed"),
    "left out": palette.color("evidence", "no data"),
}


def add(connection: sqlite3.Connection, results: Results, frames: Mapping[str, pd.DataFrame], date: str) -> None:
    """Add the table of styles and register it.

    Parameters
    ----------
    connection
        The finished GeoPackage.
    results
        Its legend gives the labels.
    frames
        The layers as written; a style lists only values that occur.
    date
        Time stamp, as the standard writes it.
    """
    connection.execute(_CREATE)
    connection.execute(
        "INSERT INTO gpkg_contents (table_name, data_type, identifier, description, last_change, srs_id) "
        "VALUES (?, 'attributes', ?, ?, ?, 0)",
        (TABLE, TABLE, _DESCRIPTION, date),
    )
    for style in styles(results, frames):
        connection.execute(
            "INSERT INTO layer_styles (f_table_catalog, f_table_schema, f_table_name, f_geometry_column, styleName, "
            "styleQML, styleSLD, useAsDefault, description, owner, ui, update_time) "
            "VALUES ('', '', ?, 'geom', ?, ?, ?, ?, ?, '', NULL, ?)",
            (style.layer, style.name, qml(style), sld(style), style.is_default, style.description, date),
        )


def styles(results: Results, frames: Mapping[str, pd.DataFrame]) -> list[Style]:
    """Return the styles of all layers with a geometry; a layer without a style of its own gets one plain sign."""
    found = []
    for layer, layout in schema.layers().items():
        if layout.geometry is None:
            continue
        columns = _BY_COLUMN.get(layer, ())
        if not columns:
            plain = Style(layer, layout.geometry, layout.title, layout.meaning, "", (Sign("", layout.title, _LINE),))
            found.append(plain)
        for rank, column in enumerate(columns):
            found.append(_by_column(results, frames[layer], layer, column, is_default=rank == 0))
    return found


def _by_column(results: Results, frame: pd.DataFrame, layer: str, column: str, is_default: bool) -> Style:
    system = {"suitability": "suitability", "evidence": "evidence"}.get(column, first_system(results))
    column = SYMBOL_COLUMN[system] if column == "symbol" else column
    described = schema.column(column)
    present = {
        str(value) for value in frame[column].dropna().unique() if str(value).isprintable()
    }  # XML takes no other
    names = dict.fromkeys(described.choices, "") or symbol_names(results, system)
    ordered = [word for word in names if word in present] + sorted(present - set(names))
    color = _STATUS_COLOR.__getitem__ if column == "status" else lambda word: palette.color(system, word)
    signs = [Sign(word, _label(word, names.get(word, "")), color(word)) for word in ordered]
    return Style(
        layer=layer,
        geometry=str(schema.layers()[layer].geometry),
        name=described.title,
        description=f"{schema.layers()[layer].title} by {described.title[0].lower()}{described.title[1:]}",
        column=column,
        signs=(*signs, Sign("", _REST, palette.NOT_DETERMINED)),
        is_default=is_default,
    )


def _label(word: str, name: str) -> str:
    return stored_text(word if not name or name == word else f"{word}: {name}")
