"""Check GeoPackages with the validator of gdal-utils: ``python tests/formats/validate_geopackage.py FILE...``.

Exit 0 if it has nothing to say about any of them, its checks beyond the standard included; else 1. The validator
is plain Python; its package asks for a compiled GDAL, so it is installed by ``pip install --no-deps gdal-utils``.
"""

from __future__ import annotations

import importlib
import sys
from pathlib import Path

VALIDATOR = "osgeo_utils.samples.validate_gpkg"


def complaints(path: Path) -> list[str]:
    """Return every error and warning about one file."""
    validator = importlib.import_module(VALIDATOR)
    said: list[object] = []
    errors = validator.check(str(path), abort_at_first_error=False, extra_checks=True, myprint=said.append)
    return [str(item) for item in [*errors, *said]]


def main(paths: list[str]) -> int:
    """Print the complaints about each file and return the exit status; no file at all is a failure too."""
    count = 0
    for path in map(Path, paths):
        found = complaints(path)
        count += len(found)
        print(f"{path}: {'valid' if not found else f'{len(found)} complaints'}", *found, sep="\n  ")
    return 0 if paths and not count else 1


if __name__ == "__main__":
    sys.exit(main(sys.argv[1:]))
