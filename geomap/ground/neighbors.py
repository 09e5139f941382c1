"""Neighbor records: what could lie in a cell is what was found near it, in shares that add to one.

For each cell:

1. logs and samples say how likely each *domain* (one origin and unit) is: simple kriging of their points;
2. inside a domain, its own records share the weight: simple-kriging weights, made non-negative;
3. what they leave unexplained goes to the background of the domain: its records by depth, borings counted alike.

A record speaks at one point or at many (`geomap.ground.voices`); its weight is the sum of theirs.

The weights are one shared set for all soil properties, so every classification and rating made from them agrees.
Relatives: indicator kriging with one shared model (Journel 1983, Mathematical Geology 15:445; from memory).
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from geomap.geostat.covariances import Model, exponential
from geomap.geostat.kriging import simple_kriging_blocks

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

# Fixed defaults. Practical range: the distance at which the correlation falls to 0.05.
HORIZONTAL_RANGE_M = 300.0  # common practice, no source
VERTICAL_RANGE_M = 2.0  # common practice, no source
NUGGET = 0.1  # share of the variance between samples side by side; common practice, no source
BACKGROUND_DEPTH_M = 1.0  # half width of the depth window of samples in the background; our choice
LAYER_DEPTH_M = 0.1  # the same for logged layers, which are known at every depth; our choice
LEAST_WEIGHT = 0.001  # smaller weights are given to the background
NEAREST = 48  # points that each cell may call on, in scaled coordinates; its block of cells shares them


@dataclass(frozen=True)
class Points:
    """Places where records speak.

    Attributes
    ----------
    distance, offset, depth
        [m]; offset right positive, depth below ground.
    domain, boring, record
        Codes from 0.
    """

    distance: Floats
    offset: Floats
    depth: Floats
    domain: Ints
    boring: Ints
    record: Ints

    def __len__(self) -> int:
        return len(self.distance)

    @property
    def places(self) -> Floats:
        """Coordinates, shape (points, 3) [m]."""
        return np.column_stack([self.distance, self.offset, self.depth])


@dataclass(frozen=True)
class Ranges:
    """Practical ranges of the correlation [m] and the share of nugget."""

    horizontal: float = HORIZONTAL_RANGE_M
    vertical: float = VERTICAL_RANGE_M
    nugget: float = NUGGET

    @property
    def model(self) -> Model:
        """The covariance over distance, offset and depth."""
        return Model(exponential, self.nugget, 1.0, (self.horizontal, self.horizontal, self.vertical))


@dataclass(frozen=True)
class Ensemble:
    """Shares of every record in every cell; they add to 1 in each cell.

    Attributes
    ----------
    weights
        Shares earned by nearness, shape (cells, records), sparse.
    background_share
        Share left to the background of each domain, shape (cells, domains).
    background
        For each depth row, the share of each record in the background of its domain, shape (depths, records);
        rows add to 1 within a domain.
    depth_row
        Row of `background` for each cell.
    record_domain
        Domain of each record.
    """

    weights: sparse.csr_array
    background_share: Floats
    background: Floats
    depth_row: Ints
    record_domain: Ints

    def tally(self, membership: Floats) -> Floats:
        """Return expected membership in each cell.

        Parameters
        ----------
        membership
            Shape (records, classes): 1 where the record belongs to the class.

        Returns
        -------
        ndarray
            Shape (cells, classes); rows add to 1 where the rows of `membership` do.
        """
        total: Floats = self.weights @ membership
        for domain in range(self.background_share.shape[1]):
            mine = self.record_domain == domain
            total += self.background_share[:, [domain]] * (self.background[:, mine] @ membership[mine])[self.depth_row]
        return total

    @property
    def background_weight(self) -> Floats:
        """Share of each cell that no nearby record explains."""
        weight: Floats = self.background_share.sum(axis=1)
        return weight

    def deepest(self, hole_depth: Floats) -> Floats:
        """Return the depth of the deepest hole that carries weight in each cell [m]; 0 where none does.

        Parameters
        ----------
        hole_depth
            Depth of the hole of each record [m], shape (records,).
        """
        carried = self.weights.copy()
        carried.data = hole_depth[carried.indices]
        return carried.max(axis=1).toarray().ravel()


def ensemble(cells: Floats, depth_row: Ints, points: Points, is_logged: bool, ranges: Ranges) -> Ensemble:
    """Weigh the records for every cell.

    Parameters
    ----------
    cells
        Distance, offset and depth of the cell centers [m], shape (cells, 3), in order of distance.
    depth_row
        Row of each cell in depth, from 0.
    points
        Where the records speak; at least one.
    is_logged
        Whether logged layers are among the points, so that domains are known at every depth of a hole.
    ranges
        Correlation along the line, across it, and in depth.
    """
    rows = int(depth_row.max(initial=0)) + 1
    row_depth = np.bincount(depth_row, cells[:, 2], rows) / np.maximum(np.bincount(depth_row, minlength=rows), 1)
    by_domain, by_record = _one_hot(points.domain), _one_hot(points.record)
    narrow = _depth_window(row_depth, points, LAYER_DEPTH_M if is_logged else BACKGROUND_DEPTH_M)
    odds = _odds(cells, points, (narrow @ by_domain)[depth_row], ranges)
    weights, share = _share(cells, points, odds, ranges)
    window = _depth_window(row_depth, points, BACKGROUND_DEPTH_M)
    in_domain = window @ by_domain
    background = (window / np.maximum(in_domain[:, points.domain], np.finfo(float).tiny)) @ by_record
    record_domain = np.zeros(by_record.shape[1], dtype=np.int64)
    record_domain[points.record] = points.domain
    return Ensemble(weights, share, np.asarray(background), depth_row, record_domain)


def _odds(cells: Floats, points: Points, prior: Floats, ranges: Ranges) -> Floats:
    """Return how likely each domain is in each cell, shape (cells, domains).

    Without a nugget: what the log says at a hole is taken as it stands. Far from holes the domains are as common
    as they are at that depth.
    """
    odds: Floats = prior / prior.sum(axis=1, keepdims=True)
    of_domain = np.eye(odds.shape[1])[points.domain]
    exact = Ranges(ranges.horizontal, ranges.vertical, 0.0).model
    for block in simple_kriging_blocks(points.places, cells, exact, nonnegative=True, neighbors=NEAREST):
        rest = 1.0 - block.weights.sum(axis=1, keepdims=True)
        odds[block.targets] = block.weights @ of_domain[block.points] + rest * odds[block.targets]
    odds /= odds.sum(axis=1, keepdims=True)
    return odds


def _share(cells: Floats, points: Points, odds: Floats, ranges: Ranges) -> tuple[sparse.csr_array, Floats]:
    """Split the odds of the domains among their records; what no record earns is left to the background."""
    share = odds.copy()
    found: list[tuple[Floats, Ints, Ints]] = []
    for domain in np.unique(points.domain):
        mine = np.flatnonzero(points.domain == domain)
        possible = np.flatnonzero(odds[:, domain] > LEAST_WEIGHT)
        places, targets = points.places[mine], cells[possible]
        for block in simple_kriging_blocks(places, targets, ranges.model, nonnegative=True, neighbors=NEAREST):
            at = possible[block.targets]
            w = block.weights * odds[at, domain][:, None]
            w[w < LEAST_WEIGHT] = 0.0
            share[at, domain] -= w.sum(axis=1)
            cell, point = np.nonzero(w)
            found.append((w[cell, point], at[cell], points.record[mine[block.points[point]]]))
    values, at_cell, at_record = (np.concatenate(part) for part in zip(*found, strict=True))
    shape = (len(cells), int(points.record.max()) + 1)
    return sparse.csr_array((values, (at_cell, at_record)), shape=shape), np.clip(share, 0.0, 1.0)


def _one_hot(codes: Ints) -> sparse.csr_array:
    entries = (np.ones(len(codes)), (np.arange(len(codes)), codes))
    return sparse.csr_array(entries, shape=(len(codes), int(codes.max(initial=0)) + 1))


def _depth_window(row_depth: Floats, points: Points, width_m: float) -> Floats:
    """Return how much each point speaks for each depth, shape (depths, points); borings count alike.

    The window falls to a quarter at `width_m`, and then with the fourth power of the gap: below the deepest hole the
    nearest depths still count most.
    """
    gap = (row_depth[:, None] - points.depth) / width_m
    window: Floats = (1.0 + gap**2) ** -2
    per_boring = window @ _one_hot(points.boring)
    # A boring with many points at a depth must not outvote one with few; far above or below, it fades as they do.
    crowd = np.maximum(per_boring[:, points.boring], 1.0)
    fair: Floats = window / crowd
    return fair
