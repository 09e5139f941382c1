"""The alignment as a line in a shapefile; without a .prj its crs is blank."""

from __future__ import annotations

from pathlib import Path

from geomap.readers.alignments.lines import RawLine, line_of_layer
from geomap.readers.options import TableOptions
from geomap.readers.spatial_files import SHAPEFILE_SUFFIXES as SUFFIXES
from geomap.readers.spatial_files import check_shapefile

NAME = "shapefile"
TITLE = "Shapefile, one line"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, options: TableOptions) -> RawLine:
    """Return the one line of the file; see :class:`geomap.readers.alignments.LineFormat`."""
    check_shapefile(path)
    return line_of_layer(path, options)
