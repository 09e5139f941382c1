"""Titles, meanings and allowed values of every column, inside the GeoPackage.

They are written in the tables of the Schema extension (OGC 12-128r17, annex F.9), where a GIS finds its column
titles, drop-down lists and ranges.
"""

from __future__ import annotations

import math
import sqlite3
from collections.abc import Iterator, Mapping
from dataclasses import dataclass

import pandas as pd

from geomap.exports.groups import symbol_names, symbol_systems
from geomap.exports.texts import stored_text
from geomap.results import Results
from geomap.tables import schema
from geomap.tables.schema import Column

_DEFINITION = "http://www.geopackage.org/spec121/#extension_schema"
_TABLES = {
    "gpkg_data_columns": """CREATE TABLE gpkg_data_columns (
        table_name TEXT NOT NULL, column_name TEXT NOT NULL, name TEXT, title TEXT, description TEXT, mime_type TEXT,
        constraint_name TEXT,
        CONSTRAINT pk_gdc PRIMARY KEY (table_name, column_name),
        CONSTRAINT gdc_tn UNIQUE (table_name, name))""",
    "gpkg_data_column_constraints": """CREATE TABLE gpkg_data_column_constraints (
        constraint_name TEXT NOT NULL, constraint_type TEXT NOT NULL, value TEXT, min NUMERIC,
        min_is_inclusive BOOLEAN, max NUMERIC, max_is_inclusive BOOLEAN, description TEXT,
        CONSTRAINT gdcc_ntv UNIQUE (constraint_name, constraint_type, value))""",
}
_OWN_COLUMNS = {  # the two that every layer has and the vocabulary has not
    "fid": ("Row", "Number of the row in this layer"),
    "geom": ("Geometry", "Place of the row, in the coordinate reference system of the layer"),
}
_GEOMETRY_MEANINGS = {
    "alignment": "The alignment; Z, where there is one, is the level of the ground in meters above the vertical datum",
    "profile_cells": "The cell in the plane of distance (m) and level (m): a section, not a place on a map",
}


@dataclass(frozen=True)
class Constraint:
    """What a column may hold: a list of words with their names, or a range."""

    name: str
    choices: Mapping[str, str | None] | None = None
    minimum: float = -math.inf
    maximum: float = math.inf
    description: str = ""

    def rows(self) -> Iterator[tuple[object, ...]]:
        """Yield its rows of gpkg_data_column_constraints."""
        if self.choices is None:
            yield self.name, "range", None, self.minimum, True, self.maximum, True, self.description
        else:
            for word, meaning in self.choices.items():
                yield self.name, "enum", word, None, None, None, None, meaning


def describe(connection: sqlite3.Connection, results: Results, frames: Mapping[str, pd.DataFrame]) -> None:
    """Add the title, the meaning and the constraint of every column of every layer.

    Parameters
    ----------
    connection
        The finished GeoPackage; no other program may have it open.
    results
        Its legend gives the words that columns of soil symbols may hold.
    frames
        The layers as written.
    """
    for table, statement in _TABLES.items():
        connection.execute(statement)
        connection.execute(
            "INSERT INTO gpkg_extensions (table_name, column_name, extension_name, definition, scope) "
            "VALUES (?, NULL, 'gpkg_schema', ?, 'read-write')",
            (table, _DEFINITION),
        )
    constraints = column_constraints(results, frames)
    connection.executemany(
        "INSERT INTO gpkg_data_column_constraints VALUES (?, ?, ?, ?, ?, ?, ?, ?)",
        [row for constraint in constraints.values() for row in constraint.rows()],
    )
    connection.executemany(
        "INSERT INTO gpkg_data_columns VALUES (?, ?, ?, ?, ?, NULL, ?)",
        [row for layer, frame in frames.items() for row in _column_rows(layer, frame, constraints)],
    )


def column_constraints(results: Results, frames: Mapping[str, pd.DataFrame]) -> dict[str, Constraint]:
    """Return, for each column that has one, its constraint; a column has the same in every layer."""
    systems = symbol_systems(results)
    names = dict.fromkeys(name for frame in frames.values() for name in frame.columns if name != "geometry")
    found: dict[str, Constraint] = {}
    for name in names:
        if name in systems:
            present = [frame[name] for frame in frames.values() if name in frame]
            found[name] = _symbols(name, symbol_names(results, systems[name]), pd.concat(present, ignore_index=True))
        elif (constraint := _constraint(schema.column(name))) is not None:
            found[name] = constraint
    return {name: constraint for name, constraint in found.items() if constraint.choices != {}}


def _symbols(name: str, legend: Mapping[str, str], values: pd.Series) -> Constraint:
    """Return the legend as a list of choices; a value that the legend lacks is let in, without a meaning."""
    words: dict[str, str | None] = {stored_text(word): stored_text(meaning) for word, meaning in legend.items()}
    others = sorted({str(value) for value in values.dropna().unique()} - set(words))
    return Constraint(f"{name}_choices", choices={**words, **dict.fromkeys(others)})


def _constraint(column: Column) -> Constraint | None:
    if column.choices:
        return Constraint(f"{column.name}_choices", choices=dict.fromkeys(column.choices))
    if column.minimum is None and column.maximum is None:
        return None
    return Constraint(
        f"{column.name}_range",
        minimum=-math.inf if column.minimum is None else column.minimum,
        maximum=math.inf if column.maximum is None else column.maximum,
        description=column.allowed,
    )


def _column_rows(
    layer: str, frame: pd.DataFrame, constraints: Mapping[str, Constraint]
) -> Iterator[tuple[object, ...]]:
    own = dict(_OWN_COLUMNS)
    if "geometry" not in frame.columns:
        del own["geom"]
    for name, (title, meaning) in own.items():
        text = _GEOMETRY_MEANINGS.get(layer, meaning) if name == "geom" else meaning
        yield layer, name, name, title, text, None
    for name in frame.columns.drop("geometry", errors="ignore"):
        column = schema.column(name)
        constraint = constraints.get(name)
        yield layer, name, name, column.title, column.meaning, constraint.name if constraint else None
