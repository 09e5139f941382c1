"""Gradation points of both tables as one long table, and curves that cannot be."""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.intake import Intake, accept, screen
from tests.unit.intake.written import asked, checks, clean, dirty

WIDE = "boring | sample | top_depth_m | passing_4_75_mm_pct | passing_0_425_mm_pct | passing_0_075_mm_pct"
LONG = "boring | sample | sieve:size_mm | passing:passing_pct"


def wide(*rows: str) -> Intake:
    """Return the intake of samples with passing columns."""
    return screen(accept(dirty(samples="\n".join([WIDE, *rows]), gradations="")))


def long(*rows: str, samples: str = WIDE + "\nBH-1 | S1 | 1 | | |\nBH-2 | S1 | 1 | | |") -> Intake:
    """Return the intake of a gradations table."""
    return screen(accept(dirty(samples=samples, gradations="\n".join([LONG, *rows]))))


def test_points_of_both_tables_know_their_sample_and_where_they_were_read() -> None:
    points = screen(accept(clean())).used("gradations")
    assert points.columns.tolist() == ["sample_row", "size_mm", "passing_pct", "file", "sheet", "row_number", "heading"]
    assert points["sample_row"].dtype == "int64"
    fines = points.loc[points["size_mm"] == 0.075].set_index("sample_row").sort_index()
    assert fines["passing_pct"].tolist() == [82, 24, 35, 91]
    assert fines["heading"].tolist() == ["passing_0_075_mm_pct"] * 3 + ["passing_pct"]
    assert fines["file"].tolist() == ["samples.csv"] * 3 + ["gradations.csv"]


def test_passing_columns_leave_the_samples_table() -> None:
    assert not [c for c in screen(accept(clean())).used("samples").columns if c.startswith("passing")]


def test_a_blank_sieve_is_not_zero() -> None:
    points = wide("BH-1 | S1 | 1 | 100 | | 40").used("gradations")
    assert points["size_mm"].tolist() == [4.75, 0.075]


# Defect 23: gradation not monotone with size.
def test_a_curve_that_rises_as_the_size_falls_is_rejected_whole() -> None:
    taken = wide("BH-1 | S1 | 1 | 90 | 40 | 55", "BH-2 | S1 | 1 | 90 | 40 | 20")
    said = asked(taken, "passing rises as size falls")
    assert said["found"].tolist() == ["55 passing 0.075 mm, but 40 passing 0.425 mm"]
    assert said[["action", "row_number", "heading"]].values.tolist() == [["reject", 2, "passing_0_075_mm_pct"]]
    assert set(taken.used("gradations")["sample_row"]) == {1}
    assert len(taken.used("samples")) == 2  # the sample keeps its other tests


@pytest.mark.parametrize(
    ("fines", "check"), [("41", "passing rises by rounding"), ("41.2", "passing rises as size falls")]
)
def test_a_rise_within_rounding_is_asked_about_and_kept(fines: str, check: str) -> None:
    taken = wide(f"BH-1 | S1 | 1 | 90 | 40 | {fines}")
    assert checks(taken) == {check}
    assert len(taken.used("gradations")) == (3 if check == "passing rises by rounding" else 0)


# Defect 24: percent retained entered as passing.
def test_a_reversed_curve_is_rejected_and_the_reading_proposed() -> None:
    taken = wide("BH-1 | S1 | 1 | 2 | 30 | 65")
    said = asked(taken, "percent retained given as passing").iloc[0]
    assert said["action"] == "reject"
    assert "100 minus these values" in said["advice"]
    assert taken.used("gradations").empty


def test_percent_retained_on_each_sieve_is_known_by_its_sum() -> None:
    rows = ["BH-1 | S1 | 4.75 | 5", "BH-1 | S1 | 2 | 25", "BH-1 | S1 | 0.425 | 40", "BH-1 | S1 | 0.075 | 30"]
    assert checks(long(*rows)) == {"percent retained on each sieve given as passing", "left out with its curve"}


# Defect 27: no fines sieve.
def test_a_gradation_without_the_sieve_for_fines_is_asked_about() -> None:
    taken = wide("BH-1 | S1 | 1 | 90 | 40 |", "BH-2 | S1 | 1 | 90 | 40 | 10")
    said = asked(taken, "no fines sieve").iloc[0]
    assert (said["action"], said["found"], said["row_number"]) == ("query", "finest sieve 0.425 mm", 2)
    assert len(taken.used("gradations")) == 5


def test_sieves_on_both_sides_of_the_fines_sieve_are_enough() -> None:
    assert checks(long("BH-1 | S1 | 0.15 | 60", "BH-1 | S1 | 0.063 | 30")) == set()


# Defect 28: fines above 100.
def test_a_percentage_above_100_is_rejected_alone() -> None:
    taken = wide("BH-1 | S1 | 1 | 100 | 99 | 180")
    said = asked(taken, "out of range").iloc[0]
    assert (said["found"], said["action"], said["heading"]) == ("180", "reject", "passing_0_075_mm_pct")
    assert taken.used("gradations")["passing_pct"].tolist() == [100, 99]


# Defect 28: sum of fractions above 100.
def test_cobbles_and_boulders_above_100_are_rejected() -> None:
    text = "boring | top_depth_m | cobbles_pct | boulders_pct\nBH-1 | 1 | 70 | 60\nBH-2 | 1 | 10 | 5"
    taken = screen(accept(dirty(samples=text, gradations="")))
    assert asked(taken, "cobbles and boulders above 100")["found"].tolist() == ["cobbles_pct 70, boulders_pct 60"]
    assert taken.used("samples")["cobbles_pct"].isna().tolist() == [True, False]


def test_a_gradation_finds_its_sample_whatever_the_case_and_blanks_of_its_name() -> None:
    taken = long("BH-1 |  s1 | 0.075 | 30")
    assert taken.used("gradations")["sample_row"].tolist() == [0]


def test_a_gradation_of_an_unknown_sample_is_left_out_with_the_one_that_may_be_meant() -> None:
    taken = long(
        "BH-1 | S-01 | 4.75 | 90", "BH-1 | S-01 | 0.075 | 30", "BH-2 | S7 | 0.075 | 30", "BH-2 | S1 | 0.075 | 9"
    )
    said = asked(taken, "gradation of an unknown sample")
    assert said["found"].tolist() == ["boring BH-1, sample S-01 (in 2 rows: 2-3)", "boring BH-2, sample S7"]
    assert said["advice"].str.startswith("did you mean S1?").tolist() == [True, False]
    assert taken.counts().set_index("table").loc["gradations"].tolist() == [4, 1, 3]


def test_a_gradation_of_a_name_that_stands_at_two_depths_is_left_out() -> None:
    samples = WIDE + "\nBH-1 | S1 | 1 | | |\nBH-1 | S1 | 3 | | |"
    taken = long("BH-1 | S1 | 0.075 | 30", samples=samples)
    assert "gradation of a sample name used twice" in checks(taken)
    assert taken.used("gradations").empty


def test_two_rows_of_one_sample_at_one_depth_share_its_gradation() -> None:
    samples = WIDE + " | ph\nBH-1 | S1 | 1 | | | | 7\nBH-1 | S1 | 1 | | | | 6"
    assert long("BH-1 | S1 | 0.075 | 30", samples=samples).used("gradations")["sample_row"].tolist() == [0]


def test_the_gradations_table_wins_where_both_tables_give_a_sieve() -> None:
    samples = WIDE + "\nBH-1 | S1 | 1 | 100 | 90 | 40"
    taken = long("BH-1 | S1 | 0.425 | 90", "BH-1 | S1 | 0.075 | 45", samples=samples)
    said = asked(taken, "sieve in two tables with two values").iloc[0]
    assert (said["found"], said["file"], said["heading"]) == ("0.075 mm: 40", "samples.csv", "passing_0_075_mm_pct")
    assert asked(taken, "sieve given twice")["found"].tolist() == ["0.425 mm: 90"]
    used = taken.used("gradations").sort_values("size_mm")
    assert used["passing_pct"].tolist() == [45, 90, 100]
    assert taken.counts().set_index("table").loc["gradations"].tolist() == [2, 2, 0]


def test_a_sieve_given_twice_in_the_gradations_table_keeps_the_first_value() -> None:
    taken = long("BH-1 | S1 | 0.425 | 90", "BH-1 | S1 | 0.075 | 45", "BH-1 | S1 | 0.075 | 50")
    assert asked(taken, "sieve given twice with two values")["found"].tolist() == ["0.075 mm: 50"]
    assert taken.used("gradations")["passing_pct"].tolist() == [90, 45]


def test_samples_without_gradations_leave_an_empty_table_of_points() -> None:
    taken = screen(accept(dirty(samples="boring | top_depth_m\nBH-1 | 1", gradations="")))
    assert taken.used("gradations").empty
    assert taken.used("gradations")["sample_row"].dtype == "int64"
    assert pd.api.types.is_float_dtype(taken.used("gradations")["passing_pct"])


def test_rows_left_out_with_their_curve_or_sample_are_listed_by_name() -> None:
    taken = long("BH-1 | S1 | 4.75 | 90", "BH-1 | S1 | 0.425 | 40", "BH-1 | S1 | 0.075 | 55")
    said = asked(taken, "left out with its curve").iloc[0]
    assert (said["heading"], said["found"]) == ("boring, sample", "boring BH-1, sample S1 (in 2 rows: 2-3)")
    assert said["row_number"] == 2
    lost = long("BH-1 | S1 | 0.425 | 90", "BH-1 | S1 | 0.075 | 55", samples=WIDE + "\nBH-1 | S1 | 9 | | |")
    assert asked(lost, "left out with its sample")["found"].tolist() == ["BH-1 (in 2 rows: 2-3)"]


def test_joined_rows_are_named_under_the_headings_of_their_own_file() -> None:
    head = "Hole:boring | Specimen:sample | sieve:size_mm | passing:passing_pct"
    rows = [f"BH-1 | S1 | {size} | {passing}" for size, passing in [(19, 90), (9.5, 60), (4.75, 75), (2, 50)]]
    samples = "Boring no:boring | Sample no:sample | top_depth_m | passing_0_075_mm_pct\nBH-1 | S1 | 1 | 20"
    taken = screen(accept(dirty(samples=samples, gradations="\n".join([head, *rows]))))
    said = asked(taken, "left out with its curve").iloc[0]
    assert said[["file", "heading"]].tolist() == ["gradations.csv", "Hole, Specimen"]
    assert said["found"] == "Hole BH-1, Specimen S1 (in 3 rows: 2-3, 5)"
    assert said[["boring", "sample"]].tolist() == ["BH-1", "S1"]
    assert asked(taken, "passing rises as size falls")["row_number"].tolist() == [4]
