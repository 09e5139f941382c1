"""Curves: percent passing a size, and the size of a percentage. Values constructed from the log-linear rule."""

from __future__ import annotations

import math

import numpy as np
import pandas as pd
import pytest

from geomap.soils.gradation import BOUNDED, INTERPOLATED, MEASURED, MISSING, Curves, curves_from_long, joined
from geomap.soils.sieve_table import table_from_wide

NAN = math.nan


def curves(*samples: dict[float, float]) -> Curves:
    points = [(row, size, pct) for row, sample in enumerate(samples) for size, pct in sample.items()]
    table = pd.DataFrame(points, columns=["row", "size_mm", "passing_pct"])
    return curves_from_long(table, table["row"].to_numpy(dtype=np.int64), len(samples))


SANDY = {19.0: 100.0, 4.75: 90.0, 0.425: 40.0, 0.15: 10.0}


@pytest.mark.parametrize(
    ("size", "passing", "how"),
    [
        (4.75, 90.0, MEASURED),
        (0.425, 40.0, MEASURED),
        (2.0, 40 + 50 * math.log(2 / 0.425) / math.log(4.75 / 0.425), INTERPOLATED),
        (75.0, 100.0, BOUNDED),
        (0.075, NAN, MISSING),
    ],
)
def test_percent_passing_is_measured_or_between_two_sizes_or_a_certain_bound(
    size: float, passing: float, how: int
) -> None:
    found, found_how = curves(SANDY).passing(size)
    assert found == pytest.approx([passing], nan_ok=True)
    assert found_how.tolist() == [how]


def test_nothing_passes_below_a_curve_that_reaches_zero() -> None:
    found, how = curves({0.425: 50.0, 0.15: 0.0}).passing(0.075)
    assert (found.tolist(), how.tolist()) == ([0.0], [BOUNDED])


def test_a_sample_without_points_passes_nothing_known() -> None:
    found, how = curves({}, SANDY).passing(4.75)
    assert found == pytest.approx([NAN, 90.0], nan_ok=True)
    assert how.tolist() == [MISSING, MEASURED]


def test_a_d_size_is_found_inside_the_curve_and_bounded_outside() -> None:
    found = curves(SANDY, {4.75: 50.0, 0.425: 20.0}, {}).size(np.array([30.0, 10.0, 10.0]))
    inside = 0.15 * (0.425 / 0.15) ** (20 / 30)
    assert found.size_mm == pytest.approx([inside, NAN, NAN], nan_ok=True)
    assert found.low_mm == pytest.approx([inside, 0.0, 0.0])
    assert found.high_mm == pytest.approx([inside, 0.425, 75.0])


def test_a_d_size_coarser_than_the_curve_lies_between_its_end_and_75_mm() -> None:
    found = curves({4.75: 50.0, 0.425: 20.0}).size(60.0)
    assert (found.low_mm[0], found.high_mm[0]) == (4.75, 75.0)
    assert np.isnan(found.size_mm[0])


def test_on_a_flat_curve_the_finest_size_that_passes_the_percentage_is_taken() -> None:
    assert curves({2.0: 60.0, 0.85: 30.0, 0.425: 30.0, 0.25: 12.0}).size(30.0).size_mm.tolist() == [0.425]


def test_a_percentage_at_the_finest_point_has_that_size() -> None:
    assert curves({2.0: 60.0, 0.25: 10.0}).size(10.0).size_mm.tolist() == [0.25]


@pytest.mark.parametrize(
    "bad",
    [
        {4.75: 80.0, 2.0: 100.0},
        {4.75: 101.0, 2.0: 90.0},
        {4.75: 90.0, 2.0: -1.0},
    ],
)
def test_a_curve_that_contradicts_itself_is_not_used(bad: dict[float, float]) -> None:
    found = curves(bad, SANDY)
    assert found.is_rejected.tolist() == [True, False]
    assert found.is_empty.tolist() == [True, False]
    wide = table_from_wide(pd.DataFrame([{"passing_4_75_mm_pct": bad[4.75], "passing_2_mm_pct": bad[2.0]}]))
    assert wide.is_rejected.tolist() == [True]
    assert np.isnan(wide.passing(2.0)[0]).all()


def test_a_rise_by_rounding_is_taken_as_flat_at_the_coarser_result() -> None:
    found = curves({4.75: 80.0, 0.075: 34.2, 0.05: 34.9, 0.02: 35.1, 0.002: 10.0})
    assert found.passing_pct.tolist() == [10.0, 34.2, 34.2, 34.2, 80.0]
    assert found.is_rejected.tolist() == [False]
    assert curves({4.75: 80.0, 0.075: 34.0, 0.05: 35.1}).is_rejected.tolist() == [True]
    wide = pd.DataFrame([{"passing_4_75_mm_pct": 80.0, "passing_0_075_mm_pct": 34.2, "passing_0_05_mm_pct": 34.9}])
    assert table_from_wide(wide).passing(0.05)[0].tolist() == [34.2]


def test_two_values_for_one_size_are_not_used_but_one_value_twice_is() -> None:
    table = pd.DataFrame({"size_mm": [2.0, 2.0, 2.0, 2.0], "passing_pct": [50.0, 50.0, 50.0, 52.0]})
    found = curves_from_long(table, np.array([0, 0, 1, 1]), 2)
    assert found.is_rejected.tolist() == [False, True]
    assert found.passing(2.0)[0] == pytest.approx([50.0, NAN], nan_ok=True)


def test_points_come_in_any_order_and_those_of_unknown_samples_are_left_out() -> None:
    table = pd.DataFrame({"size_mm": [0.15, 19.0, 2.0, 4.75], "passing_pct": [10.0, 100.0, 5.0, NAN]})
    found = curves_from_long(table, np.array([0, 0, -1, 0]), 1)
    assert found.size_mm.tolist() == [0.15, 19.0]


def test_sieves_and_hydrometer_of_a_specimen_make_one_curve() -> None:
    parts = curves({4.75: 100.0, 0.075: 60.0}, {0.05: 50.0, 0.002: 20.0}, SANDY)
    found = joined(parts, np.array([0, 0, 1]), 2)
    assert found.passing(0.05)[0] == pytest.approx([50.0, NAN], nan_ok=True)
    assert found.size(30.0).size_mm[0] == pytest.approx(0.002 * 25 ** (1 / 3))
