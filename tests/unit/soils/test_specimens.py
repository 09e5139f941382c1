"""Which rows are one specimen. All cases are constructed from the rule in `geomap.soils.specimens`."""

from __future__ import annotations

import math
from typing import Any

import pandas as pd
import pytest

from geomap.soils.specimens import join

NAN = math.nan
SIEVES = {4.75: 95.0, 0.425: 60.0, 0.075: 30.0}
HYDROMETER = {0.05: 25.0, 0.002: 10.0}
TEXTS = ("boring", "sample", "origin", "unit", "visual_group", "file")


def row(top: float = 1.0, base: float = NAN, curve: dict[float, float] | None = None, **cells: Any) -> dict[str, Any]:
    return {"boring": "B1", "top_depth_m": top, "base_depth_m": base, "curve": curve or {}, **cells}


def specimens(*rows: dict[str, Any], tolerance_m: float | None = 0.15) -> list[int]:
    return joined(*rows, tolerance_m=tolerance_m)["specimen"].tolist()


def joined(*rows: dict[str, Any], tolerance_m: float | None = 0.15) -> pd.DataFrame:
    samples = pd.DataFrame([{k: v for k, v in r.items() if k != "curve"} for r in rows])
    for name in TEXTS:
        if name in samples:
            samples[name] = samples[name].astype("string")
    points = [(k, size, pct) for k, r in enumerate(rows) for size, pct in r["curve"].items()]
    return join(samples, pd.DataFrame(points, columns=["sample_row", "size_mm", "passing_pct"]), tolerance_m)


S1, S2 = {"sample": "S1"}, {"sample": "S2"}
LIMITS = {"liquid_limit_pct": 40.0, "plastic_limit_pct": 20.0}


@pytest.mark.parametrize(
    ("first", "second", "are_one"),
    [
        (row(1.0, 1.45, SIEVES), row(1.0, 1.45, **LIMITS), True),
        (row(1.0, 1.45, SIEVES), row(1.3, 1.8, **LIMITS), True),
        (row(1.0, 1.45, SIEVES), row(1.6, 2.0, **LIMITS), True),  # exactly 0.15 m apart
        (row(1.0, 1.45, SIEVES), row(1.61, 2.0, **LIMITS), False),
        (row(1.0, curve=SIEVES), row(1.1, **LIMITS), True),
        (row(1.0, 1.45, SIEVES), row(1.0, 1.45, SIEVES, **LIMITS), False),
        (row(1.0, 1.45, SIEVES, **LIMITS), row(1.0, 1.45, SIEVES, **LIMITS), False),
        (row(1.0, 1.45, **LIMITS), row(1.0, 1.45, liquid_limit_pct=40.0), False),
        (row(1.0, 1.45, is_nonplastic=True), row(1.0, 1.45, **LIMITS), False),
        (row(1.0, 1.45, SIEVES), row(1.0, 1.45, HYDROMETER), True),
        (row(1.0, 1.45, SIEVES), row(1.0, 1.45, {0.05: 35.0}), False),  # finer, yet more passes
        (row(1.0, 1.45, SIEVES), row(1.0, 1.45, cu=5.0), False),
        (row(1.0, 1.45, SIEVES), row(1.0, 1.45, **LIMITS, boring="B2"), False),
        (row(1.0, 1.45, SIEVES, boring=None), row(1.0, 1.45, **LIMITS, boring=None), False),
        (row(1.0, 1.45, SIEVES, origin="natural"), row(1.0, 1.45, **LIMITS, origin="made ground"), False),
        (row(1.0, 1.45, SIEVES, origin="natural"), row(1.0, 1.45, **LIMITS, origin=None), True),
        (row(1.0, 1.45, SIEVES, unit="till"), row(1.0, 1.45, **LIMITS, unit="alluvium"), False),
        (row(1.0, 1.45, SIEVES, visual_group="SM"), row(1.0, 1.45, **LIMITS, visual_group="CH"), False),
        (row(NAN, NAN, SIEVES, sample="S1"), row(1.0, 1.45, **LIMITS, sample="S1"), True),
        (row(NAN, NAN, SIEVES, sample="S1"), row(1.0, 1.45, **LIMITS, sample="S2"), False),
        (row(NAN, NAN, SIEVES), row(1.0, 1.45, **LIMITS), False),
        (row(1.0, 1.45, SIEVES, sample="S1"), row(5.0, 5.45, **LIMITS, sample="S1"), False),
        # Rows of one name may repeat a value, rows of two names may not.
        (row(1.0, 1.2, SIEVES, **S1, moisture_pct=12.0), row(1.0, 1.2, **LIMITS, **S1, moisture_pct=12.0), True),
        (row(1.0, 1.2, SIEVES, **S1, moisture_pct=12.0), row(1.0, 1.2, **LIMITS, **S1, moisture_pct=15.0), False),
        (row(1.0, 1.2, SIEVES, **S1, moisture_pct=12.0), row(1.0, 1.2, **LIMITS, **S2, moisture_pct=12.0), False),
    ],
)  # fmt: skip
def test_two_rows_are_one_specimen(first: dict[str, Any], second: dict[str, Any], are_one: bool) -> None:
    assert len(set(specimens(first, second))) == (1 if are_one else 2)
    assert len(set(specimens(second, first))) == (1 if are_one else 2)


def test_without_a_tolerance_every_row_is_its_own_specimen() -> None:
    assert specimens(row(1.0, curve=SIEVES), row(1.0, **LIMITS), tolerance_m=None) == [1, 2]


def test_the_rows_whose_depths_agree_best_are_joined_first() -> None:
    assert specimens(row(1.0, 2.0, SIEVES), row(1.6, 2.0, SIEVES), row(1.5, 2.0, **LIMITS)) == [1, 2, 2]


def test_rows_of_one_name_are_joined_before_rows_that_lie_closer() -> None:
    rows = row(1.0, 1.4, SIEVES, sample="A"), row(1.2, 1.6, SIEVES, sample="B"), row(1.2, 1.6, **LIMITS, sample="A")
    assert specimens(*rows) == [1, 2, 1]


def test_three_rows_may_be_one_specimen() -> None:
    assert specimens(row(1.0, 1.4, SIEVES), row(1.0, 1.4, **LIMITS), row(1.0, 1.4, organic_pct=3.0)) == [1, 1, 1]


def test_a_specimen_does_not_creep_down_a_boring() -> None:
    rows = row(1.0, curve=SIEVES), row(1.1, organic_pct=3.0), row(1.2, **LIMITS)
    assert len(set(specimens(*rows))) == 2


def test_a_sample_that_reaches_over_many_is_found_by_each() -> None:
    bulk = row(0.5, 4.0, SIEVES, cbr_soaked_pct=5.0)
    jars = [row(depth, depth + 0.1, spt_n=9.0) for depth in (0.6, 1.0, 1.5, 2.0)]
    assert len(set(specimens(bulk, *jars, row(3.0, 3.2, **LIMITS)))) == 5


def test_the_basis_says_which_rows_at_which_depths_and_within_what() -> None:
    found = joined(
        row(1.0, 1.45, SIEVES, file="lab.csv", row_number=7),
        row(1.5, NAN, **LIMITS, file="limits.csv", row_number=3),
        row(8.0, curve=SIEVES, file="lab.csv", row_number=9),
    )["specimen_basis"]
    assert "lab.csv row 7 (1 to 1.45 m)" in found[0]
    assert "limits.csv row 3 (1.5 m)" in found[0]
    assert "0.15 m" in found[0]
    assert "common practice, no source" in found[0]
    assert found[1] == found[0]
    assert found.isna().tolist() == [False, False, True]


def test_numbers_follow_boring_and_depth_and_inputs_stay_as_they_are() -> None:
    samples = pd.DataFrame({"boring": ["B2", "B1", "B1"], "top_depth_m": [1.0, 3.0, 1.0]}, index=[5, 9, 7])
    before = samples.copy()
    found = join(samples, pd.DataFrame(columns=["sample_row", "size_mm", "passing_pct"]))
    assert found.index.tolist() == [5, 9, 7]
    assert found["specimen"].tolist() == [3, 2, 1]
    pd.testing.assert_frame_equal(samples, before)
