"""Correlation functions, their ranges, and the covariance model."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from geomap.errors import InputError
from geomap.geostat import covariances
from geomap.geostat.covariances import MODELS, Model, exponential, range_from_fluctuation, range_from_length, reach

# Constructed from the formulas: value at half and at the whole practical range.
HALF_AND_WHOLE = {
    "exponential": (np.exp(-1.5), np.exp(-3.0)),
    "spherical": (1 - 0.75 + 0.0625, 0.0),
    "gaussian": (np.exp(-0.75), np.exp(-3.0)),
    "matern32": ((1 + 2.371932259195289) * np.exp(-2.371932259195289), 0.05),
}


@pytest.mark.parametrize("name", MODELS)
def test_correlation_is_one_at_zero_and_falls_to_its_stated_value_at_the_practical_range(name: str) -> None:
    values = MODELS[name]([0.0, 0.5, 1.0])
    np.testing.assert_allclose(values, [1.0, *HALF_AND_WHOLE[name]], atol=1e-12)


@pytest.mark.parametrize("name", MODELS)
def test_correlation_never_rises_nor_goes_below_zero(name: str) -> None:
    values = MODELS[name](np.linspace(0, 5, 501))
    assert (np.diff(values) <= 0).all()
    assert (values >= 0).all()


@pytest.mark.parametrize("name", MODELS)
def test_scale_of_fluctuation_is_twice_the_area_under_the_correlation(name: str) -> None:
    area = 2 * quad(lambda h: float(MODELS[name](h)), 0, 1)[0] + 2 * quad(lambda h: float(MODELS[name](h)), 1, 30)[0]
    assert range_from_fluctuation(name, area) == pytest.approx(1.0, rel=1e-6)


@pytest.mark.parametrize(
    ("name", "by_length"),
    [
        ("exponential", lambda h: np.exp(-h / 7)),
        ("gaussian", lambda h: np.exp(-((h / 7) ** 2))),
        ("matern32", lambda h: (1 + h / 7) * np.exp(-h / 7)),
        ("spherical", lambda h: np.where(h < 7, 1 - 1.5 * h / 7 + 0.5 * (h / 7) ** 3, 0)),
    ],
)
def test_a_model_stated_by_its_length_is_the_same_model(name: str, by_length) -> None:
    lags = np.linspace(0, 40, 81)
    np.testing.assert_allclose(MODELS[name](lags / range_from_length(name, 7.0)), by_length(lags), atol=1e-12)


@pytest.mark.parametrize("name", MODELS)
def test_reach_is_where_a_thousandth_of_the_correlation_is_left(name: str) -> None:
    left = 0.0 if name == "spherical" else 0.001
    assert float(MODELS[name](reach(name))) == pytest.approx(left, abs=1e-6)


def test_the_nugget_is_part_of_the_sill() -> None:
    model = Model(exponential, nugget=0.3, sill=2.0)
    np.testing.assert_allclose(model.covariance([0.0, 1e-12, 1.0]), [2.0, 1.7, 1.7 * np.exp(-3.0)], rtol=1e-9)


def test_ranges_scale_each_coordinate() -> None:
    model = Model(exponential, ranges=(100.0, 50.0, 2.0))
    np.testing.assert_array_equal(model.scaled([[200.0, 25.0, 1.0]]), [[2.0, 0.5, 0.5]])


@pytest.mark.parametrize(
    "wrong",
    [{"nugget": -0.1}, {"nugget": 1.1}, {"sill": 0.0}, {"sill": np.nan}, {"ranges": (0.0,)}, {"ranges": ()}],
)
def test_impossible_parameters_are_refused(wrong: dict) -> None:
    with pytest.raises(InputError, match="covariance model"):
        Model(exponential, **wrong)


def test_points_without_coordinates_are_refused_with_their_number() -> None:
    with pytest.raises(InputError, match="1 without coordinates"):
        Model(exponential).scaled([[0.0, 1.0], [np.nan, 1.0]])


def test_points_that_do_not_fit_the_ranges_are_refused() -> None:
    with pytest.raises(InputError, match="shape"):
        Model(exponential, ranges=(1.0, 2.0, 3.0)).scaled([[0.0, 1.0]])


def test_an_unknown_model_is_answered_with_the_choices() -> None:
    with pytest.raises(InputError, match="exponential, spherical, gaussian, matern32"):
        covariances.correlation_named("linear")
