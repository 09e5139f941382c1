"""Depths of samples and strata, alone, against their hole and against each other."""

from __future__ import annotations

import pytest

from geomap.intake import accept, screen
from tests.unit.intake.written import asked, checks, dirty

SAMPLES = "boring | sample | top_depth_m | base_depth_m"
STRATA = "boring | top_depth_m | base_depth_m"
REST = "BH-2 | 0 | 6\nBH-3 | 0 | 8"


# Defect 16: sample below end of hole.
def test_a_sample_below_the_end_of_its_hole_is_rejected() -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nBH-1 | S1 | 6.5 | 7\nBH-1 | S2 | 6 | 6.45", gradations="")))
    said = asked(taken, "below the end of the hole").iloc[0]
    assert (said["action"], said["row_number"]) == ("reject", 2)
    assert said["found"] == "top_depth_m 6.5, base_depth_m 7; the hole ends at 6 m"
    assert taken.used("samples")["sample"].tolist() == ["S2"]  # driven from the bottom of the hole: no defect


def test_a_base_far_below_the_hole_is_asked_about_and_used() -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nBH-1 | S1 | 5 | 9", gradations="")))
    assert asked(taken, "base below the end of the hole")["action"].tolist() == ["query"]
    assert len(taken.used("samples")) == 1


# Defect 17: strata overlap or gap.
@pytest.mark.parametrize(
    ("rows", "check", "found"),
    [
        ("BH-1 | 0 | 2\nBH-1 | 1.5 | 6", "strata overlap", "two strata from 1.5 to 2 m"),
        ("BH-1 | 0 | 2\nBH-1 | 2.5 | 6", "gap between strata", "no stratum from 2 to 2.5 m"),
        ("BH-1 | 0.3 | 6", "gap between strata", "no stratum from 0 to 0.3 m"),
        ("BH-1 | 0 | 5", "gap between strata", "no stratum from 5 to 6 m"),
    ],
)
def test_strata_that_do_not_follow_each_other_are_asked_about(rows: str, check: str, found: str) -> None:
    taken = screen(accept(dirty(strata=f"{STRATA}\n{rows}\n{REST}")))
    said = asked(taken, check)
    assert (said["found"].tolist(), said["action"].tolist()) == ([found], ["query"])
    assert checks(taken) == {check}
    assert taken.rows("strata")["status"].eq("used").all()


# Defect 18: top below base.
def test_a_top_below_its_base_leaves_the_row_out_and_is_not_turned_round() -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nBH-1 | S1 | 2.5 | 2\nBH-1 | S2 | 3 | 3.5", gradations="")))
    said = asked(taken, "top below base").iloc[0]
    assert (said["action"], said["found"]) == ("reject", "top_depth_m 2.5, base_depth_m 2")
    assert taken.used("samples")["sample"].tolist() == ["S2"]


# Defect 18, for strata: a layer has a thickness, a sample may be a point.
@pytest.mark.parametrize(
    ("row", "found"),
    [
        ("BH-1 | 2 | 2", "top_depth_m 2, base_depth_m 2"),
        ("BH-1 | 2 | 1.995", "top_depth_m 2, base_depth_m 1.995"),
        ("BH-1 | 0 | 0", "top_depth_m 0, base_depth_m 0"),
    ],
)
def test_a_stratum_of_no_thickness_is_left_out(row: str, found: str) -> None:
    taken = screen(accept(dirty(strata=f"{STRATA}\nBH-1 | 0 | 2\n{row}\nBH-1 | 2 | 6\n{REST}")))
    said = asked(taken, "stratum of no thickness")
    assert said[["action", "row_number", "found"]].values.tolist() == [["reject", 3, found]]
    assert checks(taken) == {"stratum of no thickness"}
    assert taken.rows("strata")["reason"].fillna("").tolist() == ["", "no thickness", "", "", ""]


def test_a_stratum_upside_down_is_said_once() -> None:
    taken = screen(accept(dirty(strata=f"{STRATA}\nBH-1 | 0 | 6\nBH-1 | 3 | 2\n{REST}")))
    assert checks(taken) == {"top below base"}


def test_a_thin_stratum_is_a_stratum() -> None:
    rows = "BH-1 | 0 | 2\nBH-1 | 2 | 2.01\nBH-1 | 2.01 | 6"
    assert screen(accept(dirty(strata=f"{STRATA}\n{rows}\n{REST}"))).findings.empty


@pytest.mark.parametrize("base", ["2", ""])
def test_a_sample_may_be_a_point(base: str) -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nBH-1 | S1 | 2 | {base}", gradations="")))
    assert taken.findings.empty
    assert len(taken.used("samples")) == 1


# Defect 18: elevation given as depth. BH-1 has its ground level at 20.5 and is 6 m deep.
def test_levels_in_the_place_of_depths_are_asked_about() -> None:
    rows = "BH-1 | S1 | 19.5 | 19\nBH-1 | S2 | 17.0 | 16.5"
    taken = screen(accept(dirty(samples=f"{SAMPLES}\n{rows}", gradations="")))
    assert asked(taken, "level given as depth")["action"].tolist() == ["query", "query"]
    assert taken.used("samples").empty
    assert "below the end of the hole" not in checks(taken)


def test_levels_that_would_fit_as_depths_are_known_by_falling_throughout() -> None:
    borings = "boring | x | y | ground_level_m | depth_m\nBH-1 | 1 | 2 | 4 | 10"
    samples = f"{SAMPLES}\nBH-1 | S1 | 3.5 | 3\nBH-1 | S2 | 2 | 1.5"
    taken = screen(accept(dirty(borings=borings, samples=samples, strata="", gradations="")))
    assert len(asked(taken, "level given as depth")) == 2


# Defect 22: missing stored as 0.
def test_a_base_of_zero_below_a_top_is_no_base() -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nBH-1 | S1 | 2.5 | 0", gradations="")))
    assert asked(taken, "base depth of zero")["found"].tolist() == ["top_depth_m 2.5, base_depth_m 0"]
    assert taken.used("samples")["base_depth_m"].isna().all()


def test_a_stratum_without_a_base_is_left_out() -> None:
    taken = screen(accept(dirty(strata=f"{STRATA}\nBH-1 | 0 | 2\nBH-1 | 2 | 0\n{REST}")))
    assert taken.rows("strata")["status"].tolist() == ["used", "left out", "used", "used"]
