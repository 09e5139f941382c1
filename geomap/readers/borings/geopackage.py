"""Tables in a layer of an OGC GeoPackage: points for borings, any layer for the rest."""

from __future__ import annotations

from pathlib import Path

from geomap.readers import spatial
from geomap.readers.options import TableOptions
from geomap.readers.spatial_files import GEOPACKAGE_SUFFIXES as SUFFIXES
from geomap.readers.spatial_files import check_geopackage
from geomap.tables.raw import RawTable

NAME = "geopackage"
TITLE = "OGC GeoPackage"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, layout: str, options: TableOptions) -> RawTable:
    """Return the table of one layer; see :class:`geomap.readers.borings.TableFormat`."""
    check_geopackage(path)
    return spatial.read_table(path, layout, options, has_layers=True)
