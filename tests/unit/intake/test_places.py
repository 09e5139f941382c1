"""Borings on the alignment: systems, swapped coordinates, the corridor's edges, ground levels.

The line of these tests runs east along y = 0 from x = 0 to x = 1000; placing a boring is then arithmetic.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from geomap.intake import Intake, accept, place, screen
from tests.unit.intake.written import asked, checks, dirty, raw

LENGTH_M = 1000.0
HALF_WIDTH_M = 50.0


def on_line(intake: Intake, **more: object) -> pd.DataFrame:
    """Return what the alignment stage would say about the used borings."""
    borings = intake.used("borings")
    x, y = borings["x"], borings["y"]

    def away(east: pd.Series, north: pd.Series) -> pd.Series:
        return np.hypot(north, (east - east.clip(0, LENGTH_M)))

    placed = pd.DataFrame(
        {"distance_m": x.clip(0, LENGTH_M), "offset_m": -y, "away_m": away(x, y), "swapped_away_m": away(y, x)}
    )
    return placed.assign(past_end=(x < 0) | (x > LENGTH_M), ambiguous=False, **more)


def placed(*rows: str, columns: str = "boring | x | y | ground_level_m | depth_m", **more: object) -> Intake:
    """Return the intake of places of some borings, each with one sample."""
    names = [row.split("|")[0].strip() for row in rows]
    samples = "boring | sample | top_depth_m\n" + "\n".join(f"{name} | S1 | 1" for name in names)
    tables = [raw("borings", "\n".join([columns, *rows])), raw("samples", samples)]
    taken = screen(accept(tables))
    return place(taken, on_line(taken, **more), HALF_WIDTH_M)


def test_borings_on_the_corridor_give_no_findings() -> None:
    taken = screen(accept(dirty()))
    taken = place(taken, on_line(taken), HALF_WIDTH_M)
    assert taken.findings.empty
    assert taken.counts()["left_out"].sum() == 0


# Defect 1: CRS missing or wrong zone.
def test_most_borings_far_from_the_line_block() -> None:
    taken = placed("A | 100 | 90000 | 5 | 6", "B | 200 | 90000 | 5 | 6", "C | 300 | 1 | 5 | 6")
    said = taken.blocks.iloc[0]
    assert len(taken.blocks) == 1
    assert said["topic"] == "coordinates far from the line"
    assert said["found"] == "2 of 3 more than 500 m from the line (first: x 100, y 90000)"


def test_one_file_of_several_in_the_wrong_system_blocks_too() -> None:
    rows = [f"A{n} | {n * 10} | 1 | 5 | 6 | " for n in range(9)]
    rows += [f"B{n} | {n * 10} | 90000 | 5 | 6 | EPSG:32631" for n in range(3)]
    taken = placed(*rows, columns="boring | x | y | ground_level_m | depth_m | crs")
    assert taken.blocks["found"].tolist() == ["3 of 3 more than 500 m from the line (first: x 0, y 90000)"]


def test_borings_along_a_longer_line_do_not_block() -> None:
    taken = placed("A | 1200 | 3 | 5 | 6", "B | 1300 | 1 | 5 | 6", "C | 300 | 1 | 5 | 6")
    assert taken.blocks.empty
    assert asked(taken, "past the end of the line")["row_number"].tolist() == [2, 3]


# Defect 2: X and Y swapped.
def test_a_swapped_boring_is_left_out_and_the_swap_proposed() -> None:
    taken = placed("A | 100 | 1 | 5 | 6", "B | 2 | 400 | 5 | 6", "C | 300 | 1 | 5 | 6")
    said = asked(taken, "x and y may be swapped").iloc[0]
    assert (said["action"], said["found"]) == ("query", "x 2, y 400; 400 m from the line")
    assert taken.used("borings")["boring"].tolist() == taken.used("samples")["boring"].tolist() == ["A", "C"]


def test_a_table_with_most_coordinates_swapped_blocks_and_says_so() -> None:
    taken = placed("A | 2 | 700 | 5 | 6", "B | 2 | 800 | 5 | 6", "C | 3 | 900 | 5 | 6")
    assert taken.blocks["advice"].tolist() == ["x and y look swapped; change them round"]


# Defect 3: latitude and longitude in meter columns.
def test_degrees_in_columns_of_meters_block() -> None:
    taken = placed("A | -3.51 | 54.81 | 5 | 6", "B | -3.52 | 54.82 | 5 | 6", "C | -3.53 | 54.83 | 5 | 6")
    assert taken.blocks["topic"].tolist() == ["longitude and latitude as coordinates"]


def test_one_boring_in_degrees_is_left_out_alone() -> None:
    taken = placed("A | 100 | 1 | 5 | 6", "B | -3.52 | 54.82 | 5 | 6", "C | 300 | 1 | 5 | 6")
    assert taken.blocks.empty
    assert asked(taken, "longitude and latitude as coordinates")["action"].tolist() == ["reject"]
    assert taken.rows("borings").loc[1, "reason"] == "coordinates look like degrees"


def test_degrees_are_no_defect_in_a_geographic_system() -> None:
    taken = placed("A | -3.51 | 54.81 | 5 | 6", geographic=True)
    assert "longitude and latitude as coordinates" not in checks(taken)


def test_a_place_of_zero_is_no_place() -> None:
    tables = [raw("borings", "boring | x | y | depth_m\nA | 0 | 0 | 6\nB | 500100 | 1 | 6")]
    taken = screen(accept(tables))
    far = pd.DataFrame({"distance_m": [0.0, 100], "offset_m": [5e5, 1], "past_end": False, "ambiguous": False})
    taken = place(taken, far, HALF_WIDTH_M)
    assert checks(taken) == {"place of zero"}
    assert taken.used("borings")["boring"].tolist() == ["B"]


# Defect 8: ground level missing or 0.
@pytest.mark.parametrize(
    ("level", "neighbor", "check", "action", "used"),
    [
        ("", "20", "no ground level", "query", None),
        ("0", "20", "ground level of zero", "reject", None),
        ("0", "3", "ground level of zero", "query", 0.0),
    ],
)
def test_a_ground_level_missing_or_zero_between_others_is_asked_about(
    level: str, neighbor: str, check: str, action: str, used: float | None
) -> None:
    taken = placed(f"A | 100 | 1 | {neighbor} | 6", f"B | 200 | 1 | {level} | 6", f"C | 300 | 1 | {neighbor} | 6")
    said = asked(taken, check).iloc[0]
    assert (said["action"], said["row_number"]) == (action, 3)
    kept = taken.used("borings")["ground_level_m"].iloc[1]
    assert kept == used or (used is None and pd.isna(kept))


def test_levels_of_zero_by_the_sea_and_borings_without_any_level_are_not_asked_about() -> None:
    assert checks(placed("A | 100 | 1 | -1 | 6", "B | 200 | 1 | 0 | 6", "C | 300 | 1 | 0 | 6")) == set()
    assert checks(placed("A | 100 | 1 | | 6", "B | 200 | 1 | | 6")) == set()


def test_a_boring_outside_the_corridor_is_left_out_with_its_distance() -> None:
    taken = placed("A | 100 | 1 | 5 | 6", "B | 200 | -80 | 5 | 6")
    said = asked(taken, "outside the corridor").iloc[0]
    assert (said["allowed"], said["found"]) == ("within 50 m of the alignment", "x 200, y -80; 80 m from the line")
    assert taken.rows("borings")["reason"].fillna("").tolist() == ["", "80 m from the alignment"]
    assert taken.rows("samples")["reason"].fillna("").tolist() == ["", "its boring is left out"]


def test_a_boring_that_cannot_be_placed_is_left_out() -> None:
    taken = screen(accept(dirty()))
    nowhere = on_line(taken).assign(distance_m=np.nan, offset_m=np.nan, away_m=np.nan, swapped_away_m=np.nan).iloc[:1]
    taken = place(taken, pd.concat([nowhere, on_line(taken).iloc[1:]]), HALF_WIDTH_M)
    assert taken.rows("borings")["reason"].iloc[0] == "cannot be placed on the alignment"


def test_a_boring_near_two_stretches_is_asked_about_and_used() -> None:
    taken = screen(accept(dirty()))
    taken = place(taken, on_line(taken).assign(ambiguous=[True, False, False]), HALF_WIDTH_M)
    assert asked(taken, "near two stretches of the line")["boring"].tolist() == ["BH-1"]
    assert len(taken.used("borings")) == 3


def test_the_end_of_the_line_governs_over_a_small_offset() -> None:
    taken = placed("A | 1020 | 3 | 5 | 6", "B | 300 | 1 | 5 | 6")
    assert taken.rows("borings")["reason"].iloc[0] == "past the end of the alignment"
