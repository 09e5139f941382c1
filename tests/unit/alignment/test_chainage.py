"""Chainage beyond the tables of tests/spec/test_chainage.py: units, breaks, arrays, several equations."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from geomap.alignment.chainage import Chainage, Equation, chainage_from_settings
from geomap.errors import UsageError
from geomap.units import US_SURVEY_FOOT_M


def test_breaks_are_the_start_and_the_ahead_side_of_each_equation_in_meters() -> None:
    chainage = chainage_from_settings("0+00", [("10+00", "12+00"), ("15+00", "14+00")], "0+00")
    expected = [(0.0, 0.0), (304.8, 365.76), (304.8 + 91.44, 1400 * 0.3048)]
    np.testing.assert_allclose(chainage.breaks, expected)


def test_us_survey_feet_are_used_where_the_corridor_is_in_them() -> None:
    chainage = chainage_from_settings(0.0, form="0+00", length_unit="us-ft")
    np.testing.assert_allclose(chainage.distance_from_label("20000+00").distance_m, [2_000_000 * US_SURVEY_FOOT_M])
    assert chainage.label_from_distance([2_000_000 * US_SURVEY_FOOT_M]).tolist() == ["20000+00"]
    international = chainage_from_settings(0.0, form="0+00", length_unit="ft").distance_from_label("20000+00")
    # 1.22 m at 2,000,000 ft: arithmetic of the two feet.
    assert chainage.distance_from_label("20000+00").distance_m[0] - international.distance_m[0] == pytest.approx(
        1.219, abs=1e-3
    )


@pytest.mark.parametrize("label", ["2000000 ft", "2000000 us-ft", "2000000"])
def test_feet_of_a_label_are_those_of_its_chainage(label: str) -> None:
    chainage = chainage_from_settings(0.0, form="0+00", length_unit="us-ft")
    np.testing.assert_allclose(
        chainage.distance_from_label(label).distance_m, [2_000_000 * US_SURVEY_FOOT_M], rtol=1e-12
    )


def test_with_meters_the_length_unit_does_not_matter() -> None:
    assert chainage_from_settings(length_unit="us-ft").unit_m == 1.0


def test_a_chainage_may_occur_three_times_and_all_places_are_named() -> None:
    chainage = Chainage(0.0, (Equation(100.0, 50.0), Equation(100.0, 50.0)))
    located = chainage.distance_from_label(["0+075"])
    assert located.distance_m.tolist() == [75.0]
    assert located.second_distance_m.tolist() == [125.0]
    assert "75.000 and 125.000 and 175.000" in located.reason[0]


def test_an_overlap_below_the_start_is_found_on_the_line_and_not_before_it() -> None:
    chainage = Chainage(1000.0, (Equation(1100.0, 500.0),))
    located = chainage.distance_from_chainage([600.0, 400.0])
    np.testing.assert_allclose(located.distance_m, [200.0, -600.0])
    assert not located.is_ambiguous.any()


def test_an_equation_that_alters_nothing_is_harmless() -> None:
    chainage = Chainage(0.0, (Equation(100.0, 100.0),))
    located = chainage.distance_from_chainage([99.0, 100.0, 101.0])
    np.testing.assert_allclose(located.distance_m, [99.0, 100.0, 101.0])
    assert not located.is_ambiguous.any()


def test_many_distances_are_converted_at_once_and_missing_stay_missing() -> None:
    chainage = Chainage(0.0, (Equation(100.0, 150.0),))
    values = chainage.chainage_from_distance([[0.0, 100.0], [np.nan, 200.0]])
    np.testing.assert_allclose(values, [[0.0, 150.0], [np.nan, 250.0]])
    labels = chainage.label_from_distance([50.0, np.nan])
    assert labels.dtype == "string"
    assert labels.isna().tolist() == [False, True]
    located = chainage.distance_from_chainage([np.nan, 50.0])
    np.testing.assert_allclose(located.distance_m, [np.nan, 50.0])
    assert located.reason.tolist() == ["", ""]


def test_a_series_with_missing_texts_is_read_row_by_row() -> None:
    texts = pd.Series(["0+100", pd.NA, "x"], index=[7, 8, 9], dtype="string")
    located = Chainage().distance_from_label(texts)
    np.testing.assert_allclose(located.distance_m, [100.0, np.nan, np.nan])
    assert located.reason[1] == "not given"


def test_decimals_are_as_asked_and_carry_over() -> None:
    chainage = Chainage()
    assert chainage.label_from_distance([1234.5678, 999.96], decimals=1).tolist() == ["1+234.6", "1+000"]
    assert chainage.label_from_distance([1234.5678], decimals=0).tolist() == ["1+235"]


def test_no_labels_give_no_rows() -> None:
    assert Chainage().distance_from_label([]).distance_m.shape == (0,)


@pytest.mark.parametrize("wrong", [{"format": "km"}, {"start_m": np.inf}, {"unit_m": 0.0}])
def test_wrong_fields_are_refused(wrong: dict) -> None:
    with pytest.raises(UsageError):
        Chainage(**wrong)
