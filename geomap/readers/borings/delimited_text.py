"""Tables in text with a delimiter."""

from __future__ import annotations

from pathlib import Path

from geomap.readers import raw_tables
from geomap.readers.delimited import SUFFIXES
from geomap.readers.options import TableOptions
from geomap.tables.raw import RawTable

NAME = "delimited_text"
TITLE = "Text table with commas, semicolons, tabs or pipes between cells"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, layout: str, options: TableOptions) -> RawTable:
    """Return the table of a text file; see :class:`geomap.readers.borings.TableFormat`."""
    return raw_tables.from_delimited(path, layout, options)
