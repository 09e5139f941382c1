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

    def cells(self) -> Points:
        """Return the centers on the line, step by step and downward in each."""
        steps, rows = self.shape
        nought = np.zeros(steps * rows, dtype=np.int64)
        depth = np.tile(self.depth, steps)
        return Points(np.repeat(self.distance, rows), np.zeros(steps * rows), depth, nought, nought)


@dataclass(frozen=True)
class Estimate:
    """The ensemble with its records.

    Attributes
    ----------
    ensemble
        Shares of the records in each cell, cells in the order of `Grid.cells`.
    records
        The soils that vote, in the order of the ensemble's records; the index points into the table of soils.
    evidence
        observed, inferred or no data for each cell.
    """

    ensemble: Ensemble
    records: pd.DataFrame
    evidence: NDArray[np.object_]


def estimate(
    soils: pd.DataFrame, layers: pd.DataFrame, has_answer: NDArray[np.bool_], grid: Grid, ranges: Ranges
) -> Estimate:
    """Weigh the soils of a corridor for every cell of its profile.

    Parameters
    ----------
    soils
        One row for each specimen and each logged layer without one (`records.soils`), with ``boring``,
        ``distance_m``, ``offset_m``, ``top_depth_m``, ``base_depth_m``, ``hole_depth_m``, ``origin``, ``unit``.
    layers
        Logged layers with ``boring``, ``distance_m``, ``offset_m``, ``top_depth_m``, ``base_depth_m``, ``origin``,
        ``unit``; may be empty.
    has_answer
        For each row of `soils`, whether it has a group or a verdict.
    grid, ranges
        Where to estimate, and how far soils resemble each other.

    Raises
    ------
    InputError
        There is no soil to learn from.
    """
    placed = soils["distance_m"].notna().to_numpy() & np.isfinite(records.middle_depth(soils))
    soils, has_answer = soils.loc[placed], has_answer[placed]
    if not len(soils):
        raise InputError("no sample or logged layer lies on the corridor; nothing can be estimated: check the borings")
    layers = layers.loc[layers["distance_m"].notna()]
    pieces = _pieces(layers, _thickness(grid))
    names, borings = records.domains(soils), pd.concat([soils["boring"], layers["boring"]])
    domain_codes = {name: code for code, name in enumerate(dict.fromkeys([*names, *records.domains(layers)]))}
    boring_codes = {name: code for code, name in enumerate(dict.fromkeys(borings))}
    layer_points = _points(pieces, records.domains(pieces), domain_codes, boring_codes)
    names = _guess_unknown(soils, names, layer_points, domain_codes)
    votes = records.voters(names, has_answer)
    soils, names = soils.loc[votes], names[votes]
    points = _points(soils, names, domain_codes, boring_codes)
    rows = np.tile(np.arange(len(grid.depth)), len(grid.distance))
    # Many middle-sized solves: on two or more threads the linear algebra waits for itself, up to seven times as long.
    with threadpool_limits(limits=1, user_api="blas"):
        ensemble = neighbors.ensemble(grid.cells(), rows, points, layer_points, ranges)
    return Estimate(ensemble, soils, _evidence(ensemble, soils, layers, grid))


def _thickness(grid: Grid) -> float:
    return float(np.diff(grid.depth).min()) if len(grid.depth) > 1 else 2 * float(grid.depth[0])


def _pieces(layers: pd.DataFrame, thickness: float) -> pd.DataFrame:
    """Cut logged layers into pieces of about one thickness, so that a thick layer speaks over its whole depth."""
    top, base = layers["top_depth_m"].to_numpy(float), layers["base_depth_m"].to_numpy(float)
    count = np.maximum(1, np.round((base - top) / thickness)).astype(int)
    which = np.repeat(np.arange(len(layers)), count)
    number = np.arange(len(which)) - np.repeat(np.cumsum(count) - count, count)
    height = ((base - top) / count)[which]
    pieces = layers.iloc[which].copy()
    pieces["top_depth_m"] = top[which] + number * height
    pieces["base_depth_m"] = pieces["top_depth_m"] + height
    return pieces


def _points(
    table: pd.DataFrame, names: pd.Series, domain_codes: dict[str, int], boring_codes: dict[str, int]
) -> Points:
    return Points(
        distance=table["distance_m"].to_numpy(float),
        offset=table["offset_m"].to_numpy(float),
        depth=records.middle_depth(table),
        domain=np.array([domain_codes[name] for name in names], dtype=np.int64),
        boring=np.array([boring_codes[name] for name in table["boring"]], dtype=np.int64),
    )


def _guess_unknown(soils: pd.DataFrame, names: pd.Series, layers: Points, domain_codes: dict[str, int]) -> pd.Series:
    """Give a soil whose origin and unit nobody stated the domain of the nearest logged piece, where there is one."""
    unknown = (names == records.UNKNOWN_DOMAIN).to_numpy()
    if not unknown.any() or not len(layers):
        return names
    model = Ranges().model
    here = _points(soils[unknown], names[unknown], domain_codes, dict.fromkeys(soils["boring"], 0))
    _, nearest = KDTree(model.scaled(layers.places)).query(model.scaled(here.places))
    domain_names = np.array(list(domain_codes), dtype=object)
    result = names.copy()
    result[unknown] = domain_names[layers.domain[nearest]]
    return result


def _evidence(ensemble: Ensemble, soils: pd.DataFrame, layers: pd.DataFrame, grid: Grid) -> NDArray[np.object_]:
    depth = np.tile(grid.depth, len(grid.distance))
    no_data = ensemble.background_weight >= NO_DATA_BACKGROUND
    no_data |= depth > ensemble.deepest(soils["hole_depth_m"].to_numpy(float))
    evidence = np.where(no_data, NO_DATA, INFERRED).astype(object)
    evidence[_observed(soils, grid) | _observed(layers, grid)] = OBSERVED
    return evidence


def _observed(intervals: pd.DataFrame, grid: Grid) -> NDArray[np.bool_]:
    """Return for each cell whether an interval of a hole beside the step covers its middle depth."""
    steps, rows = grid.shape
    result = np.zeros((steps, rows), dtype=bool)
    distance = intervals["distance_m"].to_numpy(float)
    first = np.searchsorted(grid.distance, distance - OBSERVED_ALONG_M, side="left")
    last = np.searchsorted(grid.distance, distance + OBSERVED_ALONG_M, side="right")
    top = intervals["top_depth_m"].to_numpy(float)
    base = intervals["base_depth_m"].to_numpy(float)
    base = np.where(np.isnan(base), top, base)
    upper = np.searchsorted(grid.depth, top, side="left")
    lower = np.searchsorted(grid.depth, base, side="right")
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
