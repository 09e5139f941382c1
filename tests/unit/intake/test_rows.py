"""Rows without what they need, rows given twice, and names that must agree between tables."""

from __future__ import annotations

import pytest

from geomap.intake import accept, screen
from tests.unit.intake.written import asked, checks, dirty, raw

BORINGS = "boring | x | y | depth_m"
SAMPLES = "boring | sample | top_depth_m"


@pytest.mark.parametrize(
    ("row", "reason"),
    [
        (" | 1 | 2 | 6", "boring missing or rejected"),
        ("BH-9 | 1 | 2 | ", "depth_m missing or rejected"),
        ("BH-9 | | | 6", "x and y missing or rejected"),
        ("BH-9 | 1 | 2 | deep", "depth_m missing or rejected"),
    ],
)
def test_a_boring_without_what_it_needs_is_left_out_and_said(row: str, reason: str) -> None:
    taken = screen(accept([raw("borings", f"{BORINGS}\nBH-1 | 1 | 2 | 6\n{row}")]))
    rows = taken.rows("borings")
    assert rows["status"].tolist() == ["used", "left out"]
    assert rows.loc[1, "reason"] == reason
    assert asked(taken, "row without what it needs")["row_number"].tolist() == [3]


def test_a_sample_without_a_depth_is_left_out() -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nBH-1 | S1 | \nBH-1 | S2 | 2", gradations="")))
    assert taken.used("samples")["sample"].tolist() == ["S2"]


def test_a_line_without_one_of_its_vertices_blocks() -> None:
    taken = screen(accept([raw("vertices", "x | y\n0 | 0\n100 | \n200 | 0")]))
    assert taken.blocks["row_number"].tolist() == [3]


def test_vertices_and_levels_may_repeat() -> None:
    tables = [raw("vertices", "x | y\n0 | 0\n0 | 0"), raw("levels", "distance_m | level_m\n0 | 1\n0 | 1")]
    taken = screen(accept(tables))
    assert taken.findings.empty
    assert taken.counts()["used"].tolist() == [2, 2]


# Defect 13: duplicate boring name across phases, in different places.
def test_a_boring_given_in_two_places_is_asked_about_and_the_first_is_used() -> None:
    taken = screen(accept([raw("borings", f"{BORINGS}\nBH-1 | 1 | 2 | 6\nbh-1 | 900 | 2 | 7\nBH-2 | 5 | 5 | 6")]))
    said = asked(taken, "boring given twice, in two places").iloc[0]
    assert (said["action"], said["row_number"], said["found"]) == ("query", 3, "boring bh-1, x 900, y 2")
    assert taken.used("borings")["x"].tolist() == [1, 5]
    assert taken.rows("borings").loc[1, "reason"] == "a boring of this name is given above"


def test_a_boring_given_twice_in_one_place_is_said_in_other_words() -> None:
    taken = screen(accept([raw("borings", f"{BORINGS}\nBH-1 | 1 | 2 | 6\nBH-1 | 1 | 2 | 7")]))
    assert checks(taken) == {"boring given twice"}
    assert taken.used("borings")["depth_m"].tolist() == [6]


def test_a_row_given_twice_word_for_word_is_used_once() -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nBH-1 | S1 | 1\nBH-1 | S1 | 1\nBH-1 | S1 | 2", gradations="")))
    assert taken.rows("samples")["status"].tolist() == ["used", "left out", "used"]
    assert asked(taken, "row given twice")["row_number"].tolist() == [3]
    assert asked(taken, "sample name used at two depths")["row_number"].tolist() == [4]


# Defect 15: variants of one name.
def test_borings_whose_names_differ_by_marks_and_zeros_only_are_asked_about() -> None:
    taken = screen(accept([raw("borings", f"{BORINGS}\nBH-01 | 1 | 2 | 6\nBH1 | 9 | 2 | 6\nBH-11 | 5 | 5 | 6")]))
    assert asked(taken, "names of borings alike")["found"].tolist() == ["BH1 and BH-01"]
    assert len(taken.used("borings")) == 3


def test_a_sample_of_an_unknown_boring_is_left_out_with_the_boring_that_may_be_meant() -> None:
    samples = f"{SAMPLES}\nBH1 | S1 | 1\nBH1 | S2 | 2\nTP-7 | S1 | 1\nBH-2 | S1 | 1"
    taken = screen(accept(dirty(samples=samples, gradations="")))
    said = asked(taken, "boring not in the borings table")
    assert said["found"].tolist() == ["BH1 (in 2 rows: 2-3)", "TP-7"]
    assert said["advice"].str.startswith("did you mean BH-1?").tolist() == [True, False]
    assert taken.used("samples")["boring"].tolist() == ["BH-2"]


def test_the_spelling_of_the_borings_table_is_used_and_said() -> None:
    taken = screen(accept(dirty(samples=f"{SAMPLES}\nbh-1 | S1 | 1\nBH-2 | S1 | 1", gradations="")))
    assert taken.used("samples")["boring"].tolist() == ["BH-1", "BH-2"]
    assert asked(taken, "boring spelled otherwise")["found"].tolist() == ["bh-1"]


def test_samples_and_strata_are_left_out_with_their_boring() -> None:
    borings = "boring | x | y | depth_m\nBH-1 | 100 | 5 | 6\nBH-2 | 200 | -4 | 6\nBH-3 | 300 | 2 |"
    taken = screen(accept(dirty(borings=borings)))
    assert set(taken.used("samples")["boring"]) == set(taken.used("strata")["boring"]) == {"BH-1", "BH-2"}
    assert taken.rows("samples").loc[3, "reason"] == "its boring is left out"
    said = asked(taken, "left out with its boring")
    assert said["found"].tolist() == ["BH-3", "BH-3 (in 2 rows: 5-6)", "BH-3 (in 4 rows: 2-5)"]
    assert (taken.counts()["read"] == taken.counts()["used"] + taken.counts()["left_out"]).all()
    assert taken.counts().set_index("table").loc["gradations"].tolist() == [4, 0, 4]
