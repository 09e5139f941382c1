"""Limits, chart lines and the organic ratio."""

from __future__ import annotations

import math

import numpy as np
import pytest

from geomap.soils import plasticity
from geomap.soils.records import as_given, whole
from geomap.soils.systems.astm_d2487_rules import ZONES, chart_zones

NAN = math.nan


def columns(ll: float, pl: float, pi: float, nonplastic: bool = False) -> dict[str, np.ndarray]:
    return {
        "liquid_limit_pct": np.array([ll]),
        "plastic_limit_pct": np.array([pl]),
        "plasticity_index_pct": np.array([pi]),
        "is_nonplastic": np.array([nonplastic]),
    }


@pytest.mark.parametrize(
    ("given", "expected"),
    [
        ((40, 20, NAN), (40, 20)),
        ((38, 34.2, NAN), (38, 4)),
        ((40.5, 20.4, NAN), (41, 21)),
        ((40, 20, 13), (40, 20)),  # the reported index loses
        ((40, NAN, 13.5), (40, 14)),
        ((NAN, 20, 15), (35, 15)),
        ((40, NAN, NAN), (40, NAN)),
        ((NAN, NAN, 15), (NAN, 15)),
        ((20, 22, NAN), (20, 0)),  # plastic limit above the liquid limit: non-plastic
        ((NAN, NAN, 0), (0, 0)),
    ],
)
def test_the_index_comes_from_whole_limits_where_both_are_there(
    given: tuple[float, float, float], expected: tuple[float, float]
) -> None:
    ll, _, pi = plasticity.limits(columns(*given))
    assert [ll[0], pi[0]] == pytest.approx(list(expected), nan_ok=True)


def test_a_nonplastic_soil_keeps_a_measured_liquid_limit() -> None:
    ll, _, pi = plasticity.limits(columns(45, NAN, NAN, nonplastic=True))
    assert (ll[0], pi[0]) == (45, 0)
    ll, _, pi = plasticity.limits(columns(NAN, NAN, NAN, nonplastic=True))
    assert (ll[0], pi[0]) == (0, 0)


def test_the_unrounded_reading_keeps_fractions() -> None:
    ll, _, pi = plasticity.limits(columns(40.5, 20.2, NAN), as_given)
    assert (ll[0], pi[0]) == (40.5, pytest.approx(20.3))


def test_halves_go_up_and_a_hair_below_a_half_counts_as_the_half() -> None:
    assert whole(np.array([0.5, 1.5, 32.66 / 0.92, 35.49])).tolist() == [1, 2, 36, 35]


def test_the_a_line_is_flat_up_to_a_liquid_limit_of_25_5() -> None:
    assert plasticity.a_line([10, 25, 25.5, 40]) == pytest.approx([4, 4, 4.015, 14.6])


@pytest.mark.parametrize(("ll", "pi"), [(40, 14.6), (60, 29.2), (80, 43.8), (45, 18.25)])
def test_a_point_on_the_a_line_counts_as_above(ll: float, pi: float) -> None:
    assert plasticity.is_above_a_line(ll, pi)
    assert not plasticity.is_above_a_line(ll, pi - 0.01)


@pytest.mark.parametrize(
    ("ll", "pl", "pi", "zones"),
    [
        (40, NAN, NAN, {"ML", "CL"}),  # CL-ML needs PI up to 7, and there the A-line stands at 14.6
        (24, NAN, NAN, {"ML", "CL-ML", "CL"}),
        (3, NAN, NAN, {"ML"}),
        (60, NAN, NAN, {"MH", "CH"}),
        (NAN, NAN, 3, {"ML", "MH"}),
        (NAN, NAN, 5, {"ML", "CL-ML", "MH"}),
        (NAN, NAN, 30, {"CL", "CH", "MH"}),
        (NAN, 20, NAN, {"ML", "CL-ML", "CL", "CH"}),
        (NAN, NAN, NAN, set(ZONES)),
        (20, NAN, 30, set()),
    ],
)
def test_a_missing_limit_leaves_the_zones_that_some_value_of_it_reaches(
    ll: float, pl: float, pi: float, zones: set[str]
) -> None:
    found = plasticity.possible_zones(np.array([ll]), np.array([pl]), np.array([pi]), chart_zones)
    assert {zone for zone, bit in ZONES.items() if found[0] & bit} == zones
