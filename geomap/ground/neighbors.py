"""Neighbor records: what could lie in a cell is what was found near it, in shares that add to one.

For each cell:

1. the layer tables say how likely each *domain* (one origin and unit) is: simple kriging of the logged layers;
2. inside a domain, its own records share the weight: simple-kriging weights, made non-negative;
3. what they leave unexplained goes to the background of the domain: its records by depth, borings counted alike.

The weights are one shared set for all soil properties, so every classification and rating made from them agrees.
Relatives: indicator kriging with one shared model (Journel 1983, Mathematical Geology 15:445; from memory).
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import sparse

from geomap.geostat.covariances import Model, exponential
from geomap.geostat.kriging import simple_kriging

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
BLOCK_CELLS = 4000  # cells weighed at once, for memory
LEAST_ODDS = 1e-9


@dataclass(frozen=True)
class Points:
    """Places with a domain: records or pieces of logged layers.

    Attributes
    ----------
    distance, offset, depth
        [m]; offset right positive, depth below ground.
    domain
        Code of the domain, from 0.
    boring
        Code of the boring, from 0.
    """

    distance: Floats
    offset: Floats
    depth: Floats
    domain: Ints
    boring: Ints

    def __len__(self) -> int:
        return len(self.distance)

    @property
    def places(self) -> Floats:
        """Coordinates, shape (points, 3) [m]."""
        return np.column_stack([self.distance, self.offset, self.depth])

    def take(self, which: slice | NDArray[np.generic]) -> Points:
        """Return some of the points, by position or mask."""
        return Points(
            self.distance[which], self.offset[which], self.depth[which], self.domain[which], self.boring[which]
        )


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


def ensemble(cells: Points, depth_row: Ints, records: Points, layers: Points, ranges: Ranges) -> Ensemble:
    """Weigh the records for every cell.

    Parameters
    ----------
    cells
        Cell centers, in order of distance; ``domain`` and ``boring`` are not looked at.
    depth_row
        Row of each cell in depth, from 0.
    records
        Records that vote.
    layers
        Pieces of logged layers, about one for each thickness; none where there is no layer table.
    ranges
        Correlation along the line, across it, and in depth.
    """
    count = int(max(records.domain.max(initial=0), layers.domain.max(initial=0))) + 1
    rows = int(depth_row.max(initial=0)) + 1
    row_depth = np.bincount(depth_row, cells.depth, rows) / np.maximum(np.bincount(depth_row, minlength=rows), 1)
    voting = np.bincount(records.domain, minlength=count) > 0
    logged = (layers, LAYER_DEPTH_M) if len(layers) else (records, BACKGROUND_DEPTH_M)
    prior = _domain_prior(*logged, row_depth, count)
    weights, shares = [], []
    for block in _blocks(len(cells)):
        here = cells.take(block)
        odds = prior[depth_row[block]]
        if len(layers):
            # Without a nugget: what the log says at a hole is taken as it stands.
            w = _weights(here, layers, Ranges(ranges.horizontal, ranges.vertical, 0.0))
            odds = w @ _one_hot(layers.domain, count) + (1 - w.sum(axis=1))[:, None] * odds
        odds = np.where(voting, odds + LEAST_ODDS, 0.0)  # a domain without records leaves its odds to the others
        odds /= odds.sum(axis=1, keepdims=True)
        block_weights, block_share = _share(here, records, odds, ranges)
        weights.append(block_weights)
        shares.append(block_share)
    return Ensemble(
        weights=sparse.csr_array(sparse.vstack(weights)),
        background_share=np.vstack(shares),
        background=_background(records, row_depth, count),
        depth_row=depth_row,
        record_domain=records.domain,
    )


def _blocks(cells: int) -> Iterator[slice]:
    for start in range(0, cells, BLOCK_CELLS):
        yield slice(start, min(start + BLOCK_CELLS, cells))


def _weights(cells: Points, points: Points, ranges: Ranges) -> Floats:
    """Return non-negative simple-kriging weights, shape (cells, points); rows add to 1 at most."""
    return simple_kriging(points.places, cells.places, ranges.model, nonnegative=True, neighbors=NEAREST).weights


def _share(cells: Points, records: Points, odds: Floats, ranges: Ranges) -> tuple[sparse.csr_array, Floats]:
    """Split the odds of the domains among their records and backgrounds."""
    total = sparse.csr_array((len(cells), len(records)))
    share = odds.copy()
    for domain in np.unique(records.domain):
        mine = np.flatnonzero(records.domain == domain)
        possible = np.flatnonzero(odds[:, domain] > LEAST_WEIGHT)
        if not len(possible):
            continue
        w = _weights(cells.take(possible), records.take(mine), ranges) * odds[possible, domain][:, None]
        w[w < LEAST_WEIGHT] = 0.0
        share[possible, domain] -= w.sum(axis=1)
        at_cell, at_record = np.nonzero(w)
        entries = (w[at_cell, at_record], (possible[at_cell], mine[at_record]))
        total = total + sparse.csr_array(entries, shape=total.shape)
    return total, np.clip(share, 0.0, 1.0)


def _one_hot(codes: Ints, count: int) -> Floats:
    result = np.zeros((len(codes), count))
    result[np.arange(len(codes)), codes] = 1.0
    return result


def _depth_window(row_depth: Floats, points: Points, width_m: float) -> Floats:
    """Return how much each point speaks for each depth, shape (depths, points); borings count alike.

    The window falls to a quarter at `width_m`, and then with the fourth power of the gap: below the deepest hole the
    nearest depths still count most.
    """
    gap = (row_depth[:, None] - points.depth) / width_m
    window: Floats = (1.0 + gap**2) ** -2
    per_boring = window @ _one_hot(points.boring, int(points.boring.max(initial=0)) + 1)
    # A boring with many samples at a depth must not outvote one with few; far above or below, it fades as they do.
    crowd = np.maximum(per_boring[:, points.boring], 1.0)
    return window / crowd


def _domain_prior(points: Points, width_m: float, row_depth: Floats, count: int) -> Floats:
    """Return how common each domain is at each depth, shape (depths, domains); rows add to 1."""
    common = _depth_window(row_depth, points, width_m) @ _one_hot(points.domain, count)
    prior: Floats = common / common.sum(axis=1, keepdims=True)
    return prior


def _background(records: Points, row_depth: Floats, count: int) -> Floats:
    """Return the share of each record in the background of its domain at each depth, shape (depths, records)."""
    window = _depth_window(row_depth, records, BACKGROUND_DEPTH_M)
    in_domain = window @ _one_hot(records.domain, count)
    return window / np.maximum(in_domain[:, records.domain], np.finfo(float).tiny)
