"""Spatial file formats: their endings, and whether a file is what its ending says.

GDAL tries every format it knows on a file, some of which fetch other files; so the format is made sure of first.
"""

from __future__ import annotations

from pathlib import Path

from geomap.errors import InputError, problem
from geomap.readers.files import first_bytes, signature

GEOPACKAGE_SUFFIXES = (".gpkg",)
GEOJSON_SUFFIXES = (".geojson", ".json")
SHAPEFILE_SUFFIXES = (".shp",)
SHAPEFILE_PARTS = (".shx", ".dbf")  # beside the .shp; the .prj may be missing

_UTF8_MARK = b"\xef\xbb\xbf"


def check_geopackage(path: Path) -> None:
    """Raise where a file is not a database, as every GeoPackage is.

    Raises
    ------
    InputError
        With what it is instead.
    """
    _check(path, first_bytes(path), b"SQLite format 3\0", "a GeoPackage")


def check_geojson(path: Path) -> None:
    """Raise where a file does not begin as an object of JSON.

    Raises
    ------
    InputError
        With what it is instead.
    """
    _check(path, first_bytes(path).removeprefix(_UTF8_MARK).lstrip(), b"{", "GeoJSON")


def check_shapefile(path: Path) -> None:
    """Raise where a file is not the geometry of a shapefile, or its other parts are not beside it.

    Raises
    ------
    InputError
        With what it is instead, or what is missing.
    """
    _check(path, first_bytes(path), b"\x00\x00\x27\x0a", "a shapefile")
    try:
        endings = {item.suffix.lower() for item in path.parent.iterdir() if item.stem == path.stem}
    except OSError:  # a folder that may be entered and not listed: GDAL will say what it misses
        return
    missing = [path.stem + part for part in SHAPEFILE_PARTS if part not in endings]
    if missing:
        allowed = "the parts " + ", ".join(SHAPEFILE_PARTS) + " beside it"
        raise InputError(
            problem(path.name, f"no {' and no '.join(missing)}", allowed, "copy all parts of the shapefile")
        )


def _check(path: Path, start: bytes, mark: bytes, what: str) -> None:
    if not start.startswith(mark):
        remedy = "correct the ending of the file, or save it again in that format"
        raise InputError(problem(path.name, signature(start) or "something else", what, remedy))
