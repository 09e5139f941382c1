"""Zeros that stand for no test, D sizes, and CBR without its conditions."""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.intake import accept, held_out, screen
from tests.unit.intake.written import asked, checks, raw


# Defect 22: missing stored as 0.
@pytest.mark.parametrize("column", ["moisture_pct", "optimum_moisture_pct", "resistivity_ohm_cm", "ph", "d10_mm"])
def test_a_zero_that_cannot_be_a_result_becomes_missing(column: str) -> None:
    taken = screen(accept([raw("samples", f"boring | top_depth_m | {column}\nBH-1 | 1 | 0\nBH-1 | 2 | 5")]))
    said = asked(taken, "zero for no test").iloc[0]
    assert (said["action"], said["found"], said["heading"]) == ("reject", "0", column)
    assert taken.used("samples")[column].isna().tolist() == [True, False]


@pytest.mark.parametrize("column", ["spt_n", "swell_pct", "organic_pct", "redox_mv"])
def test_a_zero_that_can_be_a_result_is_accepted(column: str) -> None:
    taken = screen(accept([raw("samples", f"boring | top_depth_m | {column}\nBH-1 | 1 | 0")]))
    assert taken.findings.empty
    assert taken.used("samples")[column].tolist() == [0]


def test_a_cbr_of_zero_is_asked_about_and_kept() -> None:
    taken = screen(accept([raw("samples", "boring | top_depth_m | cbr_in_place_pct\nBH-1 | 1 | 0")]))
    assert checks(taken) == {"zero, or no test"}
    assert taken.used("samples")["cbr_in_place_pct"].tolist() == [0]


def test_d_sizes_that_fall_are_rejected() -> None:
    taken = screen(
        accept([raw("samples", "boring | top_depth_m | d10_mm | d30_mm | d60_mm\nBH-1 | 1 | 0.5 | 0.2 | 1")])
    )
    assert asked(taken, "D sizes out of order")["found"].tolist() == ["d10_mm 0.5, d30_mm 0.2, d60_mm 1"]
    assert taken.used("samples")[["d10_mm", "d30_mm", "d60_mm"]].isna().all(axis=None)


# Constructed from Cu = D60 / D10 and Cc = D30 squared / (D10 x D60): 0.1, 0.3 and 0.9 mm give 9 and 1.
def test_reported_coefficients_that_differ_from_the_d_sizes_are_asked_about_and_kept() -> None:
    text = """
    boring | top_depth_m | d10_mm | d30_mm | d60_mm | cu  | cc
    BH-1   | 1           | 0.1    | 0.3    | 0.9    | 9.5 | 1
    BH-1   | 2           | 0.1    | 0.3    | 0.9    | 6   | 2
    """
    taken = screen(accept([raw("samples", text)]))
    assert asked(taken, "Cu differs from the D sizes")["found"].tolist() == ["6; the D sizes give 9"]
    assert asked(taken, "Cc differs from the D sizes")["found"].tolist() == ["2; the D sizes give 1"]
    assert taken.used("samples")["cu"].tolist() == [9.5, 6]


# Defect 31: CBR without soak state, density or method.
def test_a_cbr_without_its_conditions_is_held_out_and_kept() -> None:
    text = """
    boring | top_depth_m | CBR:cbr_pct | soaked:cbr_soaked_pct | cbr_density_pct | compaction_method
    BH-1   | 1           | 7           |                       |                 |
    BH-1   | 2           |             | 5                     | 95              | T 99
    BH-1   | 3           |             | 4                     |                 | T 99
    BH-1   | 4           |             | 3                     | 95              |
    BH-1   | 5           |             | <2                    |                 |
    """
    taken = screen(accept([raw("samples", text)]))
    said = asked(taken, "CBR without soak state").iloc[0]
    assert (said["action"], said["heading"], said["found"], said["row_number"]) == ("hold_out", "CBR", "7", 2)
    lacking = asked(taken, "CBR without density or method").sort_values("row_number")
    assert lacking["row_number"].tolist() == [4, 5, 6]
    assert lacking["found"].tolist() == ["4", "3", "<2"]
    assert [text.split("; ")[1] for text in lacking["advice"]] == [
        "give the density of its specimen",
        "give the compaction method",
        "give the density of its specimen and the compaction method",
    ]
    rows = taken.used("samples")
    assert rows["cbr_soaked_pct"].notna().sum() == 4
    assert held_out(rows)["cbr_soaked_pct"].tolist() == [False, False, True, True, True]


def test_held_out_answers_on_the_index_of_its_table() -> None:
    frame = screen(accept([raw("samples", "boring | top_depth_m | cbr_pct\nBH-1 | 1 | 7")])).used("samples")
    frame = frame.set_axis([41])
    assert held_out(frame).index.equals(pd.Index([41]))
