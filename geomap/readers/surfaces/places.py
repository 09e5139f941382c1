"""Levels must say where they are: by distance or by chainage."""

from __future__ import annotations

from geomap.errors import InputError, problem
from geomap.readers.heading_messages import listed
from geomap.tables.raw import RawTable

PLACES = ("distance_m", "chainage")


def with_place(table: RawTable) -> RawTable:
    """Return a table of levels as it is.

    Raises
    ------
    InputError
        No heading says where the levels are.
    """
    if not any(name in table.headings for name in PLACES):
        where = f"{table.file}, sheet {table.sheet}" if table.sheet else table.file
        found = "no heading for a place, only " + listed([str(name) for name in table.original.columns])
        remedy = 'rename a heading, or say which it is: columns = { chainage = "your heading" }'
        raise InputError(problem(where, found, "distance_m or chainage (or station)", remedy))
    return table
