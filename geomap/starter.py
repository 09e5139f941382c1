"""A folder to begin with: the commented corridor file, and empty tables with their headings."""

from __future__ import annotations

import csv
from pathlib import Path

from geomap.corridor import FILE_NAME, Corridor
from geomap.corridor_text import template
from geomap.errors import InputError, UsageError, problem
from geomap.tables import schema

NAMED_SIEVES_MM = (75.0, 19.0, 4.75, 2.0, 0.425, 0.075)  # what ASTM D2487 and AASHTO M 145 ask for, and 19 mm
_FILES = {
    "alignment.csv": "vertices",
    "borings.csv": "borings",
    "samples.csv": "samples",
    "gradations.csv": "gradations",
    "strata.csv": "strata",
    "ground.csv": "levels",
    "formation.csv": "levels",
}


def make(folder: Path) -> list[Path]:
    """Write the starter files into a new or empty folder and return them.

    Raises
    ------
    UsageError
        The folder holds files: nothing of the user's is overwritten.
    InputError
        The folder cannot be written.
    """
    if folder.is_file() or (folder.is_dir() and any(folder.iterdir())):
        raise UsageError(problem(str(folder), "files", "a new or empty folder", "name another folder"))
    try:
        folder.mkdir(parents=True, exist_ok=True)
        files = [folder / FILE_NAME, *(folder / name for name in _FILES)]
        files[0].write_text(template(Corridor), "utf-8")
        for name, layout in _FILES.items():
            with (folder / name).open("w", encoding="utf-8", newline="") as file:
                csv.writer(file).writerow(headings(layout))
    except OSError as error:
        raise InputError(problem(str(folder), error.strerror, "a folder that can be written", "check it")) from None
    return files


def headings(layout_name: str) -> list[str]:
    """Return the headings of an empty table, with the named sieves among those of samples.

    Examples
    --------
    >>> headings("strata")
    ['boring', 'top_depth_m', 'base_depth_m', 'description', 'visual_group', 'origin', 'unit']
    """
    layout = schema.inputs()[layout_name]
    names = [name for name in layout.columns if name != "is_nonplastic"]
    if layout.takes_passing:
        at = names.index("liquid_limit_pct")
        names[at:at] = [schema.passing_column(size) for size in NAMED_SIEVES_MM]
    return names
