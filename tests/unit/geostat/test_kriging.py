"""Kriging weights: exactness, duplicates, blocks, neighborhoods, non-negativity. Data are constructed."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.optimize import nnls
from scipy.spatial.distance import cdist

from geomap.errors import InputError
from geomap.geostat import kriging
from geomap.geostat.covariances import MODELS, Model, exponential, gaussian, matern32, spherical

RANGES = (300.0, 300.0, 3.0)


def borings(seed: int, holes: int = 10, samples: int = 7) -> np.ndarray:
    """Return samples of invented borings: distance, offset, depth."""
    rng = np.random.default_rng(seed)
    at = np.repeat(
        np.column_stack([np.sort(rng.uniform(0, 1500, holes)), rng.uniform(-30, 30, holes)]), samples, axis=0
    )
    return np.column_stack([at, np.tile(np.linspace(0.5, 6.0, samples), holes) + rng.uniform(-0.2, 0.2, len(at))])


def cells(steps: int = 30, thicknesses: int = 8) -> np.ndarray:
    """Return cell centers on the line, step by step."""
    distance, depth = np.meshgrid(np.linspace(10, 1490, steps), np.linspace(0.25, 6.5, thicknesses), indexing="ij")
    return np.column_stack([distance.ravel(), np.zeros(distance.size), depth.ravel()])


@pytest.mark.parametrize("nugget", [0.0, 0.3])
@pytest.mark.parametrize("name", ["exponential", "spherical", "matern32"])
def test_a_data_point_gets_its_own_value_and_no_variance(name: str, nugget: float) -> None:
    points = borings(1)
    model = Model(MODELS[name], nugget, 1.0, RANGES)
    for answer in (
        kriging.simple_kriging(points, points, model),
        kriging.simple_kriging(points, points, model, nonnegative=True),
        kriging.ordinary_kriging(points, points, model),
    ):
        np.testing.assert_allclose(answer.weights, np.eye(len(points)), atol=1e-6)
        np.testing.assert_allclose(answer.variance, 0.0, atol=1e-6)


def test_ordinary_weights_add_to_one_and_simple_remainders_complete_to_one() -> None:
    points, targets, model = borings(2), cells(), Model(exponential, 0.1, 1.0, RANGES)
    ordinary = kriging.ordinary_kriging(points, targets, model)
    simple = kriging.simple_kriging(points, targets, model)
    np.testing.assert_allclose(ordinary.weights.sum(axis=1), 1.0, atol=1e-9)
    np.testing.assert_allclose(simple.weights.sum(axis=1) + simple.remainder, 1.0, atol=1e-12)


def test_weights_solve_the_system_written_out() -> None:
    points, targets, model = borings(3), cells(), Model(spherical, 0.2, 2.0, RANGES)
    scaled, at = points / RANGES, targets / RANGES
    covariance = np.where(cdist(scaled, scaled) == 0, 2.0, 1.8 * spherical(cdist(scaled, scaled)))
    cross = 1.8 * spherical(cdist(at, scaled))
    expected = np.linalg.solve(covariance, cross.T).T
    answer = kriging.simple_kriging(points, targets, model)
    np.testing.assert_allclose(answer.weights, expected, atol=1e-10)
    np.testing.assert_allclose(answer.variance, 2.0 - (expected * cross).sum(axis=1), atol=1e-10)

    bordered = np.block([[covariance, np.ones((len(points), 1))], [np.ones((1, len(points))), np.zeros((1, 1))]])
    solved = np.linalg.solve(bordered, np.column_stack([cross, np.ones(len(targets))]).T).T
    ordinary = kriging.ordinary_kriging(points, targets, model)
    np.testing.assert_allclose(ordinary.weights, solved[:, :-1], atol=1e-10)
    np.testing.assert_allclose(ordinary.lagrange, solved[:, -1], atol=1e-10)


def test_far_from_all_points_simple_kriging_leaves_everything_to_the_background() -> None:
    answer = kriging.simple_kriging(borings(1), [[1e7, 0.0, 2.0]], Model(exponential, 0.1, 1.0, RANGES))
    assert answer.remainder[0] == pytest.approx(1.0)
    assert answer.variance[0] == pytest.approx(1.0)


def test_without_points_simple_kriging_leaves_everything_to_the_background_and_ordinary_kriging_refuses() -> None:
    none = np.empty((0, 3))
    answer = kriging.simple_kriging(none, cells(2, 2), Model(exponential, 0.0, 3.0, RANGES))
    assert answer.weights.shape == (4, 0)
    np.testing.assert_array_equal(answer.remainder, 1.0)
    np.testing.assert_array_equal(answer.variance, 3.0)
    with pytest.raises(InputError, match="at least one"):
        kriging.ordinary_kriging(none, cells(2, 2), Model(exponential, ranges=RANGES))


def test_without_targets_there_are_no_rows() -> None:
    answer = kriging.simple_kriging(borings(1), np.empty((0, 3)), Model(exponential, ranges=RANGES))
    assert answer.weights.shape == (0, 70)


@pytest.mark.parametrize("nugget", [0.0, 0.4])
def test_samples_at_one_place_share_one_weight_equally(nugget: float) -> None:
    points, targets = borings(4), cells()
    model = Model(exponential, nugget, 1.0, RANGES)
    single = kriging.simple_kriging(points, targets, model)
    repeated = np.vstack([points, points[5], points[5] + np.array([0, 0, 1e-9])])
    doubled = kriging.simple_kriging(repeated, targets, model)
    for column in (5, 70, 71):
        np.testing.assert_allclose(doubled.weights[:, column], single.weights[:, 5] / 3, atol=1e-9)
    np.testing.assert_allclose(doubled.variance, single.variance, atol=1e-9)
    ordinary = kriging.ordinary_kriging([[0.0], [0.0], [9.0]], [[0.0]], Model(exponential, nugget), [1.0, 3.0, 9.0])
    assert ordinary.estimate[0, 0] == pytest.approx(2.0)


def test_a_target_at_one_of_several_samples_at_a_place_is_at_that_place() -> None:
    points = np.vstack([borings(4), borings(4)[5] + np.array([0, 0, 1e-7])])
    answer = kriging.simple_kriging(points, points[70:], Model(exponential, 0.4, 1.0, RANGES))
    assert answer.weights[0, [5, 70]] == pytest.approx([0.5, 0.5], abs=1e-6)
    assert answer.variance[0] == pytest.approx(0.0, abs=1e-6)


def test_a_smooth_model_on_crowded_points_is_still_solved() -> None:
    rng = np.random.default_rng(5)
    points = rng.uniform(0, 1, (300, 2))
    answer = kriging.ordinary_kriging(points, points[:50], Model(gaussian, ranges=(3.0,)), points[:, 0])
    assert np.isfinite(answer.weights).all()
    np.testing.assert_allclose(answer.estimate[:, 0], points[:50, 0], atol=1e-3)


def test_blocks_give_the_same_numbers_whatever_their_size(monkeypatch: pytest.MonkeyPatch) -> None:
    points, targets, model = borings(6), cells(), Model(exponential, 0.1, 1.0, RANGES)
    whole = kriging.simple_kriging(points, targets, model)
    ordinary = kriging.ordinary_kriging(points, targets, model)
    monkeypatch.setattr(kriging, "BLOCK_NUMBERS", 70 * 7)
    blocks = list(kriging.simple_kriging_blocks(points, targets, model))
    assert [b.targets.stop - b.targets.start for b in blocks] == [7] * 34 + [2]
    np.testing.assert_allclose(np.vstack([b.weights for b in blocks]), whole.weights, atol=1e-12)
    np.testing.assert_allclose(kriging.ordinary_kriging(points, targets, model).weights, ordinary.weights, atol=1e-12)


def test_neighborhoods_of_all_points_equal_the_whole_and_smaller_ones_lose_little_variance() -> None:
    points, targets, model = borings(7, holes=30), cells(), Model(exponential, 0.1, 1.0, RANGES)
    whole = kriging.simple_kriging(points, targets, model)
    everyone = kriging.simple_kriging(points, targets, model, neighbors=len(points))
    near = kriging.simple_kriging(points, targets, model, neighbors=24)
    np.testing.assert_allclose(everyone.weights, whole.weights, atol=1e-12)
    assert (near.weights != 0).sum() < 0.6 * near.weights.size
    assert (near.variance >= whole.variance - 1e-9).all()
    assert near.variance.mean() < 1.01 * whole.variance.mean()


def test_neighborhoods_keep_the_shares_of_samples_at_one_place() -> None:
    points = borings(8)
    twice = np.vstack([points, points])
    model = Model(exponential, 0.1, 1.0, RANGES)
    single = kriging.simple_kriging(points, cells(), model, neighbors=10)
    double = kriging.simple_kriging(twice, cells(), model, neighbors=10)
    np.testing.assert_allclose(double.weights[:, :70] + double.weights[:, 70:], single.weights, atol=1e-12)
    np.testing.assert_allclose(double.weights[:, :70], double.weights[:, 70:], atol=1e-12)


def test_fewer_than_one_neighbor_is_refused() -> None:
    with pytest.raises(InputError, match="neighbors"):
        kriging.simple_kriging(borings(1), cells(), Model(exponential, ranges=RANGES), neighbors=0)


def best_nonnegative(covariance: np.ndarray, cross: np.ndarray) -> np.ndarray:
    """Return exact weights >= 0 with a sum <= 1, target by target, by non-negative least squares."""
    root = np.linalg.cholesky(covariance)
    result = []
    for target in cross:
        right = np.linalg.solve(root, target)
        weights, _ = nnls(root.T, right)
        if weights.sum() > 1:
            weights, _ = nnls(np.vstack([root.T, np.full(len(weights), 1e4)]), np.append(right, 1e4))
        result.append(weights)
    return np.array(result)


@pytest.mark.parametrize(
    ("correlation", "nugget", "excess"),
    [
        (exponential, 0.0, 1.01),
        (exponential, 0.1, 1.01),
        (spherical, 0.0, 1.01),
        (spherical, 0.1, 1.01),
        (matern32, 0.1, 1.01),
    ],
)
@pytest.mark.parametrize("horizontal", [150.0, 600.0])
def test_nonnegative_weights_are_close_to_the_best_that_quadratic_programming_finds(
    correlation, nugget: float, excess: float, horizontal: float
) -> None:
    points, targets = borings(9), cells(20, 5)
    model = Model(correlation, nugget, 1.0, (horizontal, horizontal, 3.0))
    answer = kriging.simple_kriging(points, targets, model, nonnegative=True)
    covariance = model.covariance(cdist(model.scaled(points), model.scaled(points)))
    cross = model.covariance(cdist(model.scaled(targets), model.scaled(points)))
    best = best_nonnegative(covariance, cross)
    least = 1 - 2 * (best * cross).sum(axis=1) + ((best @ covariance) * best).sum(axis=1)
    assert (answer.weights >= 0).all()
    assert (answer.weights.sum(axis=1) <= 1 + 1e-12).all()
    assert answer.variance.mean() <= excess * least.mean()
    assert answer.remainder.mean() == pytest.approx(1 - best.sum(axis=1).mean(), abs=0.02)
    of_these = (
        1 - 2 * (answer.weights * cross).sum(axis=1) + ((answer.weights @ covariance) * answer.weights).sum(axis=1)
    )
    np.testing.assert_allclose(answer.variance, of_these, atol=1e-9)


def test_where_no_weight_is_negative_the_weights_stay_nearly_as_they_are() -> None:
    model = Model(exponential, 0.1, 1.0, (300.0,))
    free = kriging.simple_kriging([[0.0], [100.0]], [[30.0]], model)
    kept = kriging.simple_kriging([[0.0], [100.0]], [[30.0]], model, nonnegative=True)
    np.testing.assert_allclose(kept.weights, free.weights, atol=1e-12)


def test_clipping_removes_negative_weights_and_caps_the_sum() -> None:
    weights = kriging.nonnegative_weights([[0.5, -0.25, 0.25], [1.0, -0.5, 1.0], [-1.0, -1.0, 0.0]])
    np.testing.assert_allclose(weights, [[0.5, 0, 0.25], [0.5, 0, 0.5], [0, 0, 0]])


@pytest.mark.parametrize("values", [[1.0], np.ones((3, 1)), [np.nan, 1.0]])
def test_values_that_do_not_fit_the_points_are_refused(values) -> None:
    with pytest.raises(InputError, match="values"):
        kriging.ordinary_kriging([[0.0], [1.0]], [[0.5]], Model(exponential), values)


def test_inputs_are_left_as_they_were() -> None:
    points, targets = borings(1), cells()
    before = points.copy(), targets.copy()
    kriging.simple_kriging(points, targets, Model(exponential, ranges=RANGES), nonnegative=True, neighbors=12)
    np.testing.assert_array_equal(points, before[0])
    np.testing.assert_array_equal(targets, before[1])
