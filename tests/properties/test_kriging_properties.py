"""What must hold of kriging weights for any places of samples."""

from __future__ import annotations

import numpy as np
from hypothesis import given, settings
from hypothesis import strategies as st
from hypothesis.extra.numpy import arrays

from geomap.geostat.covariances import MODELS, Model
from geomap.geostat.kriging import ordinary_kriging, simple_kriging

# Whole numbers, so that samples at one place and on one line come up often.
PLACES = arrays(np.float64, st.tuples(st.integers(1, 12), st.just(2)), elements=st.integers(0, 6).map(float))
# A smooth model without a nugget is nearly singular here: its weights are finite, but large and not comparable.
SHAPES = [(name, nugget) for name in MODELS for nugget in (0.0, 0.1, 0.5) if (name, nugget) != ("gaussian", 0.0)]
VALID = st.builds(
    lambda shape, ranges: Model(MODELS[shape[0]], shape[1], 1.0, ranges),
    st.sampled_from(SHAPES),
    st.sampled_from([(2.0, 1.0), (10.0, 3.0)]),
)


@settings(max_examples=60, deadline=None)
@given(points=PLACES, targets=PLACES, model=VALID)
def test_variance_is_between_zero_and_the_sill_and_nonnegative_weights_cost_variance(
    points: np.ndarray, targets: np.ndarray, model: Model
) -> None:
    free = simple_kriging(points, targets, model)
    kept = simple_kriging(points, targets, model, nonnegative=True)
    assert np.isfinite(free.weights).all()
    assert ((free.variance >= 0) & (free.variance <= 1 + 1e-9)).all()
    assert (kept.weights >= 0).all()
    assert (kept.remainder >= -1e-12).all()
    assert (kept.variance >= free.variance - 1e-6).all()
    assert (kept.variance <= 1 + 1e-9).all()


@settings(max_examples=60, deadline=None)
@given(points=PLACES, targets=PLACES, model=VALID, level=st.floats(-1e3, 1e3))
def test_ordinary_kriging_of_a_constant_is_that_constant(
    points: np.ndarray, targets: np.ndarray, model: Model, level: float
) -> None:
    answer = ordinary_kriging(points, targets, model, np.full(len(points), level))
    np.testing.assert_allclose(answer.estimate, level, rtol=1e-6, atol=1e-6)


@settings(max_examples=40, deadline=None)
@given(points=PLACES, targets=PLACES, model=VALID, shift=st.integers(-5, 5), data=st.data())
def test_weights_follow_their_points_when_these_are_moved_or_reordered(
    points: np.ndarray, targets: np.ndarray, model: Model, shift: int, data: st.DataObject
) -> None:
    order = data.draw(st.permutations(range(len(points))))
    here = simple_kriging(points, targets, model).weights
    there = simple_kriging(points[order] + shift, targets + shift, model).weights
    np.testing.assert_allclose(there, here[:, order], atol=1e-5)
