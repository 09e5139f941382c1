"""The alignment as vertices x, y in order, in a sheet of an XLSX workbook."""

from __future__ import annotations

from pathlib import Path

from geomap.readers import raw_tables
from geomap.readers.alignments.lines import RawLine, line_of_table
from geomap.readers.options import TableOptions
from geomap.readers.workbooks import SUFFIXES

NAME = "xlsx"
TITLE = "Office Open XML workbook with vertices in order: x, y"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, options: TableOptions) -> RawLine:
    """Return the line through the vertices; see :class:`geomap.readers.alignments.LineFormat`."""
    return line_of_table(raw_tables.from_workbook(path, "vertices", options))
