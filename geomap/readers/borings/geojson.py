"""Tables in GeoJSON: points for borings, any feature for the rest."""

from __future__ import annotations

from pathlib import Path

from geomap.readers import spatial
from geomap.readers.options import TableOptions
from geomap.readers.spatial_files import GEOJSON_SUFFIXES as SUFFIXES
from geomap.readers.spatial_files import check_geojson
from geomap.tables.raw import RawTable

NAME = "geojson"
TITLE = "GeoJSON (RFC 7946)"

__all__ = ["NAME", "SUFFIXES", "TITLE", "read"]


def read(path: Path, layout: str, options: TableOptions) -> RawTable:
    """Return the table of the features; see :class:`geomap.readers.borings.TableFormat`."""
    check_geojson(path)
    return spatial.read_table(path, layout, options)
