"""The alignment as a line in a layer of an OGC GeoPackage."""

from __future__ import annotations

from pathlib import Path

from geomap.readers.alignments.lines import RawLine, line_of_layer
from geomap.readers.options import TableOptions
from geomap.readers.spatial_files import GEOPACKAGE_SUFFIXES as SUFFIXES
from geomap.readers.spatial_files import check_geopackage

NAME = "geopackage"
TITLE = "OGC GeoPackage, one line"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, options: TableOptions) -> RawLine:
    """Return the one line of the file; see :class:`geomap.readers.alignments.LineFormat`."""
    check_geopackage(path)
    return line_of_layer(path, options, has_layers=True)
