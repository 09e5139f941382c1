"""Simulated fields: statistics against the model with a fixed seed, and independence of realizations."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from scipy.stats import kstest

from geomap.errors import InputError
from geomap.geostat import simulation
from geomap.geostat.covariances import MODELS
from geomap.geostat.simulation import GaussianField, probability_field, uniform

SHAPE, SPACING, RANGES = (30, 12), (10.0, 0.5), (120.0, 2.5)


@pytest.mark.parametrize("nugget", [0.0, 0.3])
@pytest.mark.parametrize("name", MODELS)
def test_variance_and_correlation_over_many_realizations_are_those_of_the_model(name: str, nugget: float) -> None:
    field = GaussianField(name, RANGES, SPACING, nugget).fit(SHAPE)
    drawn = np.stack([field.draw(3, k) for k in range(600)]).astype(float)
    # About ten independent patches each: standard errors near 0.013 (mean) and 0.018 (products); three are allowed.
    assert drawn.mean() == pytest.approx(0.0, abs=0.06)
    assert (drawn**2).mean() == pytest.approx(1.0, abs=0.06)
    for along, down in [(1, 0), (0, 1), (3, 2), (6, 0), (0, 4), (20, 0)]:
        product = drawn[:, along:, down:] * drawn[:, : SHAPE[0] - along, : SHAPE[1] - down]
        lag = np.hypot(along * 10.0 / 120.0, down * 0.5 / 2.5)
        assert product.mean() == pytest.approx((1 - nugget) * float(MODELS[name](lag)), abs=0.06), (along, down)


@pytest.mark.parametrize("ranges", [(50.0, 0.4), (120.0, 2.5), (3000.0, 2.5), (120.0, 60.0)])
@pytest.mark.parametrize("name", MODELS)
def test_the_torus_reproduces_the_model_at_every_lag_of_the_grid(name: str, ranges: tuple[float, float]) -> None:
    field = GaussianField(name, ranges, SPACING).fit(SHAPE)
    assert field.clipped_share_ < 1e-6
    assert field.correlation_error_ < 2e-3


@pytest.mark.parametrize("name", MODELS)
def test_the_reported_error_is_the_one_of_the_exact_covariance_of_the_draws(name: str) -> None:
    field = GaussianField(name, (30.0, 1.0), SPACING).fit((6, 4))
    # A draw is linear in its noise: feed unit noise through the same transform, cell by cell.
    torus = field.torus_
    unit = np.eye(int(np.prod(torus))).reshape(-1, *torus)
    rows = np.fft.irfftn(np.fft.rfftn(unit, axes=(1, 2)) * field._amplitude, s=torus, axes=(1, 2))[:, :6, :4]
    covariance = rows.reshape(len(unit), -1).T @ rows.reshape(len(unit), -1)
    at = np.array(list(itertools.product(np.arange(6) * 10 / 30.0, np.arange(4) * 0.5)))
    model = MODELS[name](np.sqrt(((at[:, None] - at[None]) ** 2).sum(axis=2)))
    np.testing.assert_allclose(np.abs(covariance - model).max(), field.correlation_error_, atol=1e-5)
    np.testing.assert_allclose(np.diag(covariance), 1.0, atol=1e-5)


def test_what_a_model_that_is_not_valid_loses_is_reported_and_the_variance_stays_one(
    monkeypatch: pytest.MonkeyPatch,
) -> None:
    # Correlation 1 within half the range and 0 beyond is no covariance in two dimensions.
    monkeypatch.setattr(simulation, "correlation_named", lambda _: lambda h: (np.asarray(h) < 0.5).astype(float))
    field = GaussianField("spherical", (60.0, 2.0), SPACING).fit((12, 8))
    assert field.clipped_share_ > 0.01
    assert field.correlation_error_ > 0.01
    drawn = np.stack([field.draw(1, k) for k in range(400)])
    assert (drawn**2).mean() == pytest.approx(1.0, abs=0.06)


def test_a_realization_does_not_depend_on_how_many_are_drawn_nor_on_their_order() -> None:
    field = GaussianField("exponential", RANGES, SPACING).fit(SHAPE)
    forward = [field.draw(11, k) for k in range(5)]
    np.testing.assert_array_equal(GaussianField("exponential", RANGES, SPACING).fit(SHAPE).draw(11, 4), forward[4])
    few = list(probability_field(SHAPE, SPACING, RANGES, realizations=2, seed=11))
    many = list(probability_field(SHAPE, SPACING, RANGES, realizations=5, seed=11))
    for one, other in zip(few, many, strict=False):
        np.testing.assert_array_equal(one, other)
    np.testing.assert_array_equal(many[4], uniform(forward[4]))


def test_realizations_and_seeds_are_independent() -> None:
    field = GaussianField("spherical", RANGES, SPACING).fit((200, 12))
    drawn = [field.draw(1, 0), field.draw(1, 1), field.draw(2, 0), field.draw(2, 1)]
    for one, other in itertools.combinations(drawn, 2):
        assert abs(np.corrcoef(one.ravel(), other.ravel())[0, 1]) < 0.2
        assert not np.array_equal(one, other)


def test_a_probability_field_is_uniform_in_each_cell_and_never_0_or_1() -> None:
    stack = np.stack(list(probability_field((8, 4), SPACING, RANGES, realizations=800, seed=5)))
    assert stack.dtype == np.float32
    assert stack.min() > 0
    assert stack.max() < 1
    for cell in [(0, 0), (7, 3), (4, 1)]:
        assert kstest(stack[:, *cell], "uniform").pvalue > 0.001


def test_an_axis_of_one_cell_is_a_line_and_one_cell_is_one_number() -> None:
    line = GaussianField("exponential", RANGES, SPACING).fit((1, 12))
    assert line.draw(0, 0).shape == (1, 12)
    assert len(line.torus_) == 1
    one = GaussianField("exponential", RANGES, SPACING).fit((1, 1))
    values = [float(one.draw(0, k)[0, 0]) for k in range(400)]
    assert np.std(values) == pytest.approx(1.0, abs=0.15)


def test_three_axes_are_drawn_too() -> None:
    assert GaussianField("matern32", (50.0, 50.0, 2.0), (10.0, 10.0, 0.5)).fit((6, 5, 4)).draw(0, 0).shape == (6, 5, 4)


@pytest.mark.parametrize(
    ("ranges", "spacing", "nugget", "shape"),
    [
        ((0.0, 1.0), SPACING, 0.0, SHAPE),
        (RANGES, (10.0,), 0.0, SHAPE),
        (RANGES, SPACING, 1.5, SHAPE),
        (RANGES, SPACING, 0.0, (0, 5)),
        ((1e7, 1e3), SPACING, 0.0, SHAPE),
    ],
)
def test_impossible_grids_are_refused(ranges, spacing, nugget, shape) -> None:
    with pytest.raises(InputError, match="simulated field"):
        GaussianField("exponential", ranges, spacing, nugget).fit(shape)


def test_a_probability_field_refuses_at_once_and_not_on_the_first_draw() -> None:
    with pytest.raises(InputError):
        probability_field(SHAPE, SPACING, (0.0, 1.0), realizations=1, seed=1)


def test_making_a_field_only_assigns() -> None:
    assert vars(GaussianField("no such model", (), (), 7.0)) == {
        "correlation": "no such model",
        "ranges": (),
        "spacing": (),
        "nugget": 7.0,
    }
