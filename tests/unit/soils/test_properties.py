"""Records of samples. Numbers constructed from the definitions of ASTM D2487 and the log-linear curve."""

from __future__ import annotations

import math
from typing import Any

import numpy as np
import pandas as pd
import pytest

from geomap.soils.properties import describe, essentials, properties
from geomap.soils.sieve_table import table_from_wide
from geomap.soils.systems import aashto_m145, astm_d2487
from tests.unit.soils.samples import samples_from

NAN = math.nan
NO_CURVES = pd.DataFrame({"sample_row": [], "size_mm": [], "passing_pct": []})


def record(curve: dict[float, float], **cells: Any) -> pd.Series:
    samples = pd.DataFrame([{"boring": "B1", "top_depth_m": 1.0, **cells}], index=[7])
    points = pd.DataFrame({"sample_row": 7, "size_mm": list(curve), "passing_pct": list(curve.values())})
    found = describe(samples, points)
    assert found.index.tolist() == [7]
    return found.loc[7]


def test_fractions_are_those_of_the_part_finer_than_75_mm() -> None:
    found = record({300.0: 95.0, 75.0: 80.0, 4.75: 40.0, 0.075: 8.0})
    assert found["passing_4_75_mm_pct"] == pytest.approx(50.0)
    assert [found[name] for name in ("gravel_pct", "sand_pct", "fines_pct")] == pytest.approx([50.0, 40.0, 10.0])
    assert [found["cobbles_pct"], found["boulders_pct"]] == pytest.approx([15.0, 5.0])
    assert found["gradation_basis"] == (
        "measured: 4.75, 0.075 mm; interpolated: 2, 0.425 mm; divided by percent passing 75 mm"
    )


def test_percent_passing_75_mm_may_lie_between_two_sizes() -> None:
    found = record({150.0: 100.0, 37.5: 80.0, 4.75: 45.0, 0.075: 9.0})
    assert found["passing_0_075_mm_pct"] == pytest.approx(10.0)
    assert found["cobbles_pct"] == pytest.approx(10.0)
    assert "(interpolated)" in found["gradation_basis"]


def test_reported_cobbles_win_and_blank_ones_stay_blank() -> None:
    curve = {19.0: 90.0, 4.75: 60.0, 0.075: 10.0}
    assert record(curve, cobbles_pct=7.0)["cobbles_pct"] == 7.0
    assert math.isnan(record(curve)["cobbles_pct"])
    assert record({**curve, 75.0: 100.0})["cobbles_pct"] == 0.0


def test_a_curve_all_coarser_than_75_mm_has_no_fractions() -> None:
    assert math.isnan(record({300.0: 100.0, 75.0: 0.0, 4.75: 0.0})["fines_pct"])


CURVE = {9.5: 100.0, 4.75: 90.0, 0.85: 60.0, 0.425: 30.0, 0.15: 10.0, 0.075: 4.0}


def test_cu_and_cc_come_from_the_curve_and_their_bounds_meet() -> None:
    found = record(CURVE)
    assert [found["d10_mm"], found["d30_mm"], found["d60_mm"]] == pytest.approx([0.15, 0.425, 0.85])
    assert found["cu"] == pytest.approx(0.85 / 0.15)
    assert found["cc"] == pytest.approx(0.425**2 / (0.15 * 0.85))
    assert found["cu_low"] == found["cu_high"] == found["cu"]
    assert found["cc_low"] == found["cc_high"] == found["cc"]


def test_reported_values_win_over_the_curve() -> None:
    assert record(CURVE, cu=9.0)["cu"] == 9.0
    assert record(CURVE, d10_mm=0.1)["cu"] == pytest.approx(8.5)
    found = record({}, d10_mm=0.1, d30_mm=0.8, d60_mm=1.9)
    assert (found["cu"], found["cc"]) == pytest.approx((19.0, 0.64 / 0.19))
    assert found["gradation_basis"] == "reported: D10, D30, D60"


def test_a_d_size_below_the_curve_leaves_bounds_on_cu_and_cc() -> None:
    found = record({9.5: 100.0, 0.85: 60.0, 0.425: 30.0, 0.15: 12.0})
    assert math.isnan(found["cu"])
    assert (found["cu_low"], found["cc_low"]) == pytest.approx((0.85 / 0.15, 0.425**2 / (0.15 * 0.85)))
    assert found["cu_high"] == found["cc_high"] == math.inf


def test_a_d_size_above_the_curve_is_at_most_75_mm() -> None:
    found = record({4.75: 50.0, 0.85: 30.0, 0.425: 10.0})
    assert (found["cu_low"], found["cu_high"]) == pytest.approx((4.75 / 0.425, 75 / 0.425))
    assert (found["cc_low"], found["cc_high"]) == pytest.approx((0.85**2 / (0.425 * 75), 0.85**2 / (0.425 * 4.75)))


def test_without_a_curve_there_are_no_bounds() -> None:
    assert math.isnan(record({})["cu_low"])
    assert pd.isna(record({})["gradation_basis"])


def test_a_rejected_curve_is_said_so() -> None:
    found = record({4.75: 50.0, 0.075: 60.0}, liquid_limit_pct=40.0)
    assert math.isnan(found["fines_pct"])
    assert found["gradation_basis"] == "curve not used: a finer size passes more than a coarser one"


def test_peat_is_named_by_the_visual_group_or_by_the_organic_content_the_project_states() -> None:
    samples = pd.DataFrame({"boring": ["B", "C", "D"], "visual_group": ["Pt", None, None], "organic_pct": [NAN, 6, 5]})
    assert describe(samples, NO_CURVES)["is_peat"].tolist() == [True, False, False]
    assert describe(samples, NO_CURVES, organic_limit_pct=5)["is_peat"].tolist() == [True, True, False]


@pytest.mark.parametrize(
    ("text", "symbol", "by_eye"),
    [
        ("SM", "SM", 1), ("gp-gm ", "GP-GM", 1), ("MH", "MH", 1), ("SP-SC", "SP-SC", 2), ("CH", "CH", 2),
        ("SC-SM", "SC-SM", 0), ("SM-SC", "SC-SM", 0), ("GM-GC", "GC-GM", 0), ("ML-CL", "CL-ML", 0), ("SW", "SW", 0),
        ("OL", "OL", 0), ("", None, 0), (None, None, 0),
    ],
)  # fmt: skip
def test_a_visual_group_is_a_symbol_and_may_say_silt_or_clay(text: str | None, symbol: str | None, by_eye: int) -> None:
    found = describe(pd.DataFrame({"boring": ["B"], "visual_group": [text]}), NO_CURVES).iloc[0]
    assert found["visual_code"] == (astm_d2487.SYMBOLS.index(symbol) + 1 if symbol else 0)
    assert found["fines_by_eye"] == by_eye


@pytest.mark.parametrize("text", ["CL/CH", "clay", "S-M", "GW-SM"])
def test_another_text_is_no_symbol(text: str) -> None:
    found = describe(pd.DataFrame({"boring": ["B"], "visual_group": [text]}), NO_CURVES).iloc[0]
    assert (found["visual_code"], found["fines_by_eye"]) == (-1, 0)


def test_rows_of_one_specimen_share_its_record() -> None:
    samples = pd.DataFrame(
        {
            "boring": ["B2", "B1", "B1"],
            "top_depth_m": [3.0, 1.0, 1.1],
            "is_nonplastic": pd.array([False, False, True], dtype="boolean"),
            "organic_pct": [1.0, 2.0, NAN],
            "visual_group": pd.array([None, None, "SM"], dtype="string"),
        },
        index=[30, 10, 20],
    )
    points = pd.DataFrame({"sample_row": [10, 10], "size_mm": [4.75, 0.075], "passing_pct": [90.0, 30.0]})
    before = samples.copy(), points.copy()
    found = describe(samples, points)
    assert found.index.tolist() == [30, 10, 20]
    assert found["fines_pct"].tolist() == pytest.approx([NAN, 30.0, 30.0], nan_ok=True)
    assert found["is_nonplastic"].tolist() == [False, True, True]
    assert found["organic_pct"].tolist() == [1.0, 2.0, 2.0]
    assert found["fines_by_eye"].tolist() == [0, 1, 1]
    assert found["specimen"].tolist() == [2, 1, 1]
    pd.testing.assert_frame_equal(samples, before[0])
    pd.testing.assert_frame_equal(points, before[1])


def test_no_samples_give_no_records_with_the_same_columns() -> None:
    samples = pd.DataFrame({"boring": ["B"], "top_depth_m": [1.0]})
    empty, one = describe(samples.iloc[:0], NO_CURVES), describe(samples, NO_CURVES)
    assert len(empty) == 0
    assert empty.columns.tolist() == one.columns.tolist()


def test_the_short_record_agrees_with_the_full_one() -> None:
    samples = samples_from(
        [
            {"p75": 90, "p4": 60, "p10": 40, "p40": 20, "p200": 8, "p002": 2},
            {"p4": 100, "p10": 95, "p200": 60, "ll": 40, "pl": 20, "cobbles": 5},
            {"p4": 80, "cu": 5, "cc": 2, "p200": 4},
        ]
    )
    table = table_from_wide(samples)
    full, short = properties(samples, table), essentials(samples, table, {*astm_d2487.NEEDS, *aashto_m145.NEEDS})
    for name in short.columns.difference(["cu", "cc", *(n for n in short if n[:2] in ("d1", "d3", "d6", "cu", "cc"))]):
        pd.testing.assert_series_equal(short[name], full[name])
    few = full["fines_pct"] < 12.5
    for name in ("cu_low", "cu_high", "cc_low", "cc_high"):
        np.testing.assert_allclose(short.loc[few, name], full.loc[few, name])
    few &= samples["cu"].isna()
    for name in ("d10_mm", "d30_mm", "d60_low_mm"):
        np.testing.assert_allclose(short.loc[few, name], full.loc[few, name])
