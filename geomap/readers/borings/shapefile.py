"""Tables in a shapefile: points for borings, any shape for the rest. Without a .prj its crs is blank."""

from __future__ import annotations

from pathlib import Path

from geomap.readers import spatial
from geomap.readers.options import TableOptions
from geomap.readers.spatial_files import SHAPEFILE_SUFFIXES as SUFFIXES
from geomap.readers.spatial_files import check_shapefile
from geomap.tables.raw import RawTable

NAME = "shapefile"
TITLE = "Shapefile"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, layout: str, options: TableOptions) -> RawTable:
    """Return the attribute table; see :class:`geomap.readers.borings.TableFormat`."""
    check_shapefile(path)
    return spatial.read_table(path, layout, options)
