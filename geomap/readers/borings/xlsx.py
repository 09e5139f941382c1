"""Tables in a sheet of an XLSX workbook."""

from __future__ import annotations

from pathlib import Path

from geomap.readers import raw_tables
from geomap.readers.options import TableOptions
from geomap.readers.workbooks import SUFFIXES
from geomap.tables.raw import RawTable

NAME = "xlsx"
TITLE = "Office Open XML workbook"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, layout: str, options: TableOptions) -> RawTable:
    """Return the table of one sheet; see :class:`geomap.readers.borings.TableFormat`."""
    return raw_tables.from_workbook(path, layout, options)
