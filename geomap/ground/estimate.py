"""From tables of soils and logged layers to the ensemble of a grid of cells, with its evidence."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy.spatial import KDTree
from threadpoolctl import threadpool_limits

from geomap.errors import InputError
from geomap.ground import neighbors, records
from geomap.ground.neighbors import Ensemble, Points, Ranges
from geomap.ground.voices import voices

Floats = NDArray[np.float64]

OBSERVED, INFERRED, NO_DATA = "observed", "inferred", "no data"
OBSERVED_ALONG_M = 5.0  # design, words: evidence
NO_DATA_BACKGROUND = 0.9  # design, words: evidence


@dataclass(frozen=True)
class Grid:
    """Cell centers of the profile: steps along the line by rows in depth.

    Attributes
    ----------
    distance
        Center of each step [m], ascending.
    depth
        Middle depth of each row below ground [m], ascending.
    half_width
        Half the width of the formation at each step [m].
    """

    distance: Floats
    depth: Floats
    half_width: Floats

    @property
    def shape(self) -> tuple[int, int]:
        """Steps, rows."""
        return len(self.distance), len(self.depth)

    @property
    def thickness(self) -> float:
        """Thickness of a row [m]; the first row begins at the ground."""
        return 2.0 * float(self.depth[0])

    def cells(self) -> Floats:
        """Return distance, offset and depth of the centers [m], step by step and downward in each."""
        steps, rows = self.shape
        depth = np.tile(self.depth, steps)
        return np.column_stack([np.repeat(self.distance, rows), np.zeros(steps * rows), depth])


@dataclass(frozen=True)
class Estimate:
    """The ensemble with its records.

    Attributes
    ----------
    ensemble
        Shares of the records in each cell, cells in the order of `Grid.cells`.
    records
        The specimens and layers that speak, in the order of the ensemble's records.
    evidence
        observed, inferred or no data for each cell.
    """

    ensemble: Ensemble
    records: pd.DataFrame
    evidence: NDArray[np.object_]


def estimate(
    specimens: pd.DataFrame, layers: pd.DataFrame, is_answered: NDArray[np.bool_], grid: Grid, ranges: Ranges
) -> Estimate:
    """Weigh the soils of a corridor for every cell of its profile.

    Parameters
    ----------
    specimens, layers
        One row for each specimen, and one for each logged layer, with ``boring``, ``distance_m``, ``offset_m``,
        ``top_depth_m``, ``base_depth_m``, ``hole_depth_m``, ``origin``, ``unit``; either may be empty.
    is_answered
        For each specimen, whether it has a class or a verdict.
    grid, ranges
        Where to estimate, and how far soils resemble each other.

    Raises
    ------
    InputError
        There is no soil to learn from.
    """
    placed = specimens["distance_m"].notna().to_numpy() & np.isfinite(records.middle_depth(specimens))
    specimens, is_answered = specimens.loc[placed], is_answered[placed]
    thick = (layers["base_depth_m"] > layers["top_depth_m"]).to_numpy(bool, na_value=False)
    layers = layers.loc[layers["distance_m"].notna().to_numpy() & thick]
    if not len(specimens) and not len(layers):
        raise InputError("no sample or logged layer lies on the corridor; nothing can be estimated: check the borings")
    spoken = voices(specimens, layers, is_answered, grid.thickness)
    spoken["domain"] = _guess_unknown(spoken, ranges)
    speaking, record = np.unique(spoken["record"].to_numpy(np.int64), return_inverse=True)
    points = Points(
        distance=spoken["distance_m"].to_numpy(float),
        offset=spoken["offset_m"].to_numpy(float),
        depth=spoken["depth_m"].to_numpy(float),
        domain=pd.factorize(spoken["domain"])[0].astype(np.int64),
        boring=pd.factorize(spoken["boring"])[0].astype(np.int64),
        record=record.astype(np.int64),
    )
    rows = np.tile(np.arange(len(grid.depth)), len(grid.distance))
    # Many middle-sized solves: on two or more threads the linear algebra waits for itself, up to seven times as long.
    with threadpool_limits(limits=1, user_api="blas"):
        ensemble = neighbors.ensemble(grid.cells(), rows, points, bool(len(layers)), ranges)
    soils = pd.concat([specimens, layers])
    return Estimate(ensemble, soils.iloc[speaking], _evidence(ensemble, soils.iloc[speaking], soils, grid))


def _guess_unknown(spoken: pd.DataFrame, ranges: Ranges) -> pd.Series:
    """Give a point whose origin and unit nobody stated the domain of the nearest point that has one, if any has."""
    names = spoken["domain"].astype(object).copy()
    unknown = (names == records.UNKNOWN_DOMAIN).to_numpy(bool)
    if not unknown.any() or unknown.all():
        return names
    scaled = ranges.model.scaled(spoken[["distance_m", "offset_m", "depth_m"]].to_numpy(float))
    # The points of a record go together: they follow the middle one.
    of_record = pd.DataFrame(scaled[unknown]).groupby(spoken["record"][unknown].to_numpy()).mean()
    _, nearest = KDTree(scaled[~unknown]).query(of_record.to_numpy(float))
    guess = dict(zip(of_record.index, names[~unknown].to_numpy()[nearest], strict=True))
    names[unknown] = spoken["record"][unknown].map(guess)
    return names


def _evidence(ensemble: Ensemble, speaking: pd.DataFrame, soils: pd.DataFrame, grid: Grid) -> NDArray[np.object_]:
    depth = np.tile(grid.depth, len(grid.distance))
    no_data = ensemble.background_weight >= NO_DATA_BACKGROUND
    no_data |= depth > ensemble.deepest(speaking["hole_depth_m"].to_numpy(float))
    evidence = np.where(no_data, NO_DATA, INFERRED).astype(object)
    evidence[_observed(soils, grid)] = OBSERVED
    return evidence


def _observed(intervals: pd.DataFrame, grid: Grid) -> NDArray[np.bool_]:
    """Return for each cell whether a hole beside the center of the step shows it.

    An interval shows the cells whose middle it covers, which is at least half of their thickness, and the cell in
    which its own middle lies, so that a short sample or one without a base shows one cell.
    """
    result = np.zeros(grid.shape, dtype=bool)
    distance = intervals["distance_m"].to_numpy(float)
    first = np.searchsorted(grid.distance, distance - OBSERVED_ALONG_M, side="left")
    last = np.searchsorted(grid.distance, distance + OBSERVED_ALONG_M, side="right")
    middle = records.middle_depth(intervals)
    top = intervals["top_depth_m"].to_numpy(float)
    base = np.fmax(intervals["base_depth_m"].to_numpy(float), top)
    own = np.floor(middle / grid.thickness).astype(np.int64)
    upper = np.minimum(np.searchsorted(grid.depth, top, side="left"), own)
    lower = np.minimum(np.maximum(np.searchsorted(grid.depth, base, side="right"), own + 1), len(grid.depth))
    # One row for each interval and each step beside it, then one for each row of cells: few, as holes are few.
    which = np.repeat(np.arange(len(intervals)), np.maximum(last - first, 0))
    step = _runs(first, last)
    beside = np.abs(intervals["offset_m"].to_numpy(float))[which] <= grid.half_width[step]
    which, step = which[beside], step[beside]
    at = np.repeat(step, np.maximum(lower - upper, 0)[which])
    result[at, _runs(upper[which], lower[which])] = True
    return result.ravel()


def _runs(first: NDArray[np.int64], last: NDArray[np.int64]) -> NDArray[np.int64]:
    """Return ``first[0], first[0] + 1, ... last[0] - 1, first[1], ...`` as one array."""
    length = np.maximum(last - first, 0)
    start = np.repeat(first - (np.cumsum(length) - length), length)
    return start + np.arange(length.sum())
