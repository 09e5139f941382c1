"""A small invented corridor, written file by file so that a test can spoil one thing at a time."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from pathlib import Path

CORRIDOR = """\
[corridor]
name = "Small line"
crs = "EPSG:32633"
half_width_m = 50
issue = "test"
[alignment]
file = "line.csv"
start_chainage = 1000
equations = [{ back = 1300.0, ahead = 1350.0 }]
[borings]
file = "borings.csv"
[samples]
file = "samples.csv"
[gradations]
file = "gradations.csv"
[strata]
file = "strata.csv"
[ground]
file = "ground.csv"
[formation]
file = "formation.csv"
reference = "formation"
[profile]
thickness_m = 0.5
depth_m = 3.0
systems = ["astm_d2487", "aashto_m145", "usda_texture"]
[estimation]
realizations = 40
[outputs]
folder = "out"
"""

Rows = Sequence[Sequence[object]]
X, Y = 500_000, 5_000_000

TABLES: dict[str, tuple[Sequence[str], Rows]] = {
    "line.csv": (("x", "y"), [(X, Y), (X + 600, Y)]),
    "borings.csv": (
        ("boring", "x", "y", "ground_level_m", "depth_m", "date"),
        [
            ("A-1", X + 105, Y + 3, 20.0, 4.0, "2026-05-04"),
            ("A-2", X + 305, Y - 3, 20.5, 4.0, "2026-05-05"),
            ("A-3", X + 505, Y + 2, 21.0, 4.0, "2026-05-06"),
            ("A-4", X + 300, Y + 80, 20.5, 4.0, "2026-05-07"),
        ],
    ),
    "samples.csv": (
        (
            *("boring", "sample", "top_depth_m", "base_depth_m", "description", "visual_group"),
            *("LL", "PL", "moisture_pct", "cbr_soaked_pct", "cbr_density_pct", "compaction_method", "lab_sheet"),
        ),
        [
            ("A-1", "S1", 0.5, 1.0, "lean clay", "CL", 38, 19, 21, 4, 95, "T 99", "L-1"),
            ("A-1", "S2", 2.0, 2.5, "silty sand", "SM", "NP", "NP", 14, "", "", "", "L-1"),
            ("A-2", "S1", 0.5, 1.0, "fat clay", "CH", 62, 24, 30, "<2", 95, "T 99", "L-2"),
            ("A-2", "S2", 2.0, 2.5, "silty sand", "SM", "NP", "NP", 13, "", "", "", "L-2"),
            ("A-3", "S1", 0.5, 1.0, "lean clay", "CL", 41, 20, 22, 5, 95, "T 99", "L-3"),
            ("A-3", "S2", 2.0, 2.5, "peat", "PT", "", "", 210, "", "", "", ""),
            ("A-4", "S1", 0.5, 1.0, "lean clay", "CL", 35, 18, 20, "", "", "", ""),
        ],
    ),
    "gradations.csv": (
        ("boring", "sample", "size_mm", "passing_pct"),
        [
            (boring, sample, size, passing)
            for boring, sample, curve in (
                ("A-1", "S1", (100, 100, 98, 90, 82)),
                ("A-1", "S2", (100, 98, 90, 60, 22)),
                ("A-2", "S1", (100, 100, 99, 97, 93)),
                ("A-2", "S2", (100, 97, 88, 55, 20)),
                ("A-3", "S1", (100, 100, 97, 88, 79)),
            )
            for size, passing in zip((9.5, 4.75, 2, 0.425, 0.075), curve, strict=True)
        ],
    ),
    "strata.csv": (
        ("boring", "top_depth_m", "base_depth_m", "visual_group", "origin", "unit"),
        [
            row
            for boring in ("A-1", "A-2", "A-3")
            for row in (
                (boring, 0, 0.3, "OL", "topsoil", "Topsoil"),
                (boring, 0.3, 1.5, "CL", "natural", "Upper clay"),
                (boring, 1.5, 4.0, "SM", "natural", "Lower sand"),
            )
        ],
    ),
    "ground.csv": (("distance_m", "level_m"), [(0, 20.0), (600, 21.2)]),
    "formation.csv": (("chainage", "level_m"), [("1+000", 19.5), ("1+350", 20.0), ("1+650", 22.9)]),
}


def write(folder: Path, corridor: str = CORRIDOR, tables: Mapping[str, tuple[Sequence[str], Rows]] = TABLES) -> Path:
    """Write the corridor into `folder` and return the folder."""
    folder.mkdir(parents=True, exist_ok=True)
    (folder / "corridor.toml").write_text(corridor, "utf-8")
    for name, (head, rows) in tables.items():
        with (folder / name).open("w", newline="", encoding="utf-8") as file:
            csv.writer(file).writerows([head, *rows])
    return folder


def changed(name: str, row: int, heading: str, value: object) -> dict[str, tuple[Sequence[str], Rows]]:
    """Return the tables with one cell changed; `row` counts from 0 below the headings."""
    head, rows = TABLES[name]
    at = list(head).index(heading)
    spoiled = [tuple(value if (k, j) == (row, at) else cell for j, cell in enumerate(r)) for k, r in enumerate(rows)]
    return {**TABLES, name: (head, spoiled)}
