"""Gradation curves: percent passing a size, and the size that a percentage is finer than.

Curves of many samples stand one after another in flat arrays, so that a hydrometer curve with sizes of its own
costs no more than a sieve curve. Nothing is extrapolated: outside a curve there are bounds, and no value.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils.records import Flags, Floats, number

# How a percent passing was found.
MEASURED, INTERPOLATED, BOUNDED, MISSING = 0, 1, 2, 3

COBBLE_MM, BOULDER_MM = 75.0, 300.0  # lower limits, ASTM D2487-17 section 3
SAME_SIZE = 1e-6  # relative; sizes closer than this are one sieve
# Results are reported in whole percent (ASTM D6913 Method A, from memory): a rise by up to that much toward a finer
# size is rounding, and the coarser result stands for both, as a sieve stands for the hydrometer that follows it.
ROUNDING_PCT = 1.0

Ints = NDArray[np.int64]
Hows = NDArray[np.uint8]


@dataclass(frozen=True)
class Sizes:
    """The size that a percentage is finer than, for each sample.

    Attributes
    ----------
    size_mm
        The size [mm]; NaN where it lies outside the curve.
    low_mm, high_mm
        Bounds [mm], equal to the size where it is known; 0 and 75 mm, or the end of the curve, where not.
    """

    size_mm: Floats
    low_mm: Floats
    high_mm: Floats


@dataclass(frozen=True)
class Curves:
    """Gradation curves, each from its finest size to its coarsest.

    Attributes
    ----------
    size_mm, passing_pct
        Points of all curves, one after another.
    start
        Where the points of each sample start, with the end added; shape (samples + 1).
    is_rejected
        Samples whose points were not used: percent passing rises toward a finer size, or there are two values for one
        size, by more than rounding.
    """

    size_mm: Floats
    passing_pct: Floats
    start: Ints
    is_rejected: Flags

    def __len__(self) -> int:
        """Return the number of samples."""
        return len(self.start) - 1

    @property
    def is_empty(self) -> Flags:
        """Samples without any point."""
        return np.asarray(self.start[1:] == self.start[:-1])

    def take(self, rows: NDArray[Any]) -> Curves:
        """Return the curves of some samples, in the order given."""
        length = np.diff(self.start)[rows]
        start = np.concatenate([[0], np.cumsum(length)])
        points = np.arange(start[-1]) + np.repeat(self.start[rows] - start[:-1], length)
        return Curves(self.size_mm[points], self.passing_pct[points], start, self.is_rejected[rows])

    def _counts(self, is_before: Flags) -> Ints:
        """Return, for each curve, how many of its points are marked."""
        running = np.concatenate([[0], np.cumsum(is_before, dtype=np.int64)])
        return np.asarray(running[self.start[1:]] - running[self.start[:-1]])

    def passing(self, size_mm: float) -> tuple[Floats, Hows]:
        """Return the percent passing a size, and how it was found.

        Parameters
        ----------
        size_mm
            Sieve opening or diameter [mm], above 0.

        Returns
        -------
        Percent passing, shape (samples), NaN where the curve does not tell; and for each sample `MEASURED`,
        `INTERPOLATED` (linear in the logarithm of size between the sizes on both sides), `BOUNDED` (100 above a
        curve that reaches 100, 0 below one that reaches 0) or `MISSING`.

        Examples
        --------
        >>> points = pd.DataFrame({"size_mm": [2.0, 0.02], "passing_pct": [100.0, 20.0]})
        >>> curves = curves_from_long(points, np.array([0, 0]), 1)
        >>> [curves.passing(size)[0].round(1).tolist() for size in (4.75, 0.2, 0.002)]
        [[100.0], [60.0], [nan]]
        """
        first = self.start[:-1]
        at = first + self._counts(self.size_mm < size_mm * (1 - SAME_SIZE))
        pct = np.full(len(self), np.nan)
        how = np.full(len(self), MISSING, dtype=np.uint8)
        inside = np.flatnonzero(at < self.start[1:])
        coarser = at[inside]
        is_measured = self.size_mm[coarser] <= size_mm * (1 + SAME_SIZE)
        pct[inside[is_measured]] = self.passing_pct[coarser[is_measured]]
        how[inside[is_measured]] = MEASURED
        rest, coarser = inside[~is_measured], coarser[~is_measured]
        has_finer = coarser > first[rest]
        rows, upper = rest[has_finer], coarser[has_finer]
        low, high = self.passing_pct[upper - 1], self.passing_pct[upper]
        share = np.log(size_mm / self.size_mm[upper - 1]) / np.log(self.size_mm[upper] / self.size_mm[upper - 1])
        pct[rows] = low + (high - low) * share
        how[rows] = np.where(low == high, BOUNDED, INTERPOLATED)
        below = rest[~has_finer]
        self._bound(pct, how, below[self.passing_pct[first[below]] == 0.0], 0.0)
        above = np.flatnonzero((at == self.start[1:]) & (at > first))
        self._bound(pct, how, above[self.passing_pct[at[above] - 1] == 100.0], 100.0)
        return pct, how

    @staticmethod
    def _bound(pct: Floats, how: Hows, rows: Ints, value: float) -> None:
        pct[rows] = value
        how[rows] = BOUNDED

    def size(self, passing_pct: float | Floats) -> Sizes:
        """Return the size that a percentage of each sample is finer than.

        Parameters
        ----------
        passing_pct
            Percentage [%], above 0 and below 100, one for all samples or one for each.

        Notes
        -----
        The logarithm of size is linear in percent passing between the points on both sides. Where the curve is
        flat at the percentage, the finest size that passes it. No value outside the curve. (Project rule; ASTM
        D2487 gives none.)

        Examples
        --------
        >>> points = pd.DataFrame({"size_mm": [0.85, 0.425], "passing_pct": [48.0, 21.0]})
        >>> curves_from_long(points, np.array([0, 0]), 1).size(30.0).size_mm.round(3).tolist()
        [0.535]
        """
        target = np.broadcast_to(np.asarray(passing_pct, dtype=np.float64), len(self))
        is_one = np.ndim(passing_pct) == 0
        by_point = passing_pct if is_one else np.repeat(target, np.diff(self.start))
        first, end = self.start[:-1], self.start[1:]
        at = first + self._counts(self.passing_pct < by_point)
        low, high = np.zeros(len(self)), np.full(len(self), COBBLE_MM)
        has_finer = np.flatnonzero(at > first)
        low[has_finer] = np.minimum(self.size_mm[at[has_finer] - 1], COBBLE_MM)
        inside = np.flatnonzero(at < end)
        high[inside] = np.minimum(self.size_mm[at[inside]], COBBLE_MM)
        size = np.full(len(self), np.nan)
        rows = inside[at[inside] > first[inside]]
        finer, coarser = at[rows] - 1, at[rows]
        share = (target[rows] - self.passing_pct[finer]) / (self.passing_pct[coarser] - self.passing_pct[finer])
        size[rows] = self.size_mm[finer] * np.exp(share * np.log(self.size_mm[coarser] / self.size_mm[finer]))
        rows = inside[(at[inside] == first[inside]) & (self.passing_pct[at[inside]] == target[inside])]
        size[rows] = self.size_mm[at[rows]]
        is_known = ~np.isnan(size)
        low[is_known] = high[is_known] = size[is_known]
        return Sizes(size, low, high)


def _curves(size: Floats, passing: Floats, row: Ints, rows: int) -> Curves:
    """Return the curves of points sorted by row and size, without those that contradict themselves."""
    is_bad = ~((passing >= 0.0) & (passing <= 100.0) & (size > 0.0))
    same_row = row[1:] == row[:-1]
    rise = np.where(same_row, passing[:-1] - passing[1:], 0.0)  # toward the finer size
    is_bad[1:] |= rise > ROUNDING_PCT
    is_bad[1:] |= same_row & (size[1:] <= size[:-1] * (1 + SAME_SIZE)) & (rise < -ROUNDING_PCT)
    while (rise > 0.0).any():
        passing = np.append(np.where(rise > 0.0, passing[1:], passing[:-1]), passing[-1:])
        rise = np.where(same_row, passing[:-1] - passing[1:], 0.0)
    is_rejected = np.zeros(rows, dtype=bool)
    is_rejected[row[is_bad]] = True
    if is_rejected.any():
        keep = ~is_rejected[row]
        size, passing, row = size[keep], passing[keep], row[keep]
    start = np.concatenate([[0], np.cumsum(np.bincount(row, minlength=rows))])
    return Curves(size, passing, start, is_rejected)


def curves_from_long(gradations: pd.DataFrame, row: NDArray[Any], rows: int) -> Curves:
    """Return curves from a table with one row for each point.

    Parameters
    ----------
    gradations
        Columns ``size_mm`` and ``passing_pct``, in any order of rows.
    row
        For each point the position of its sample, 0 to ``rows - 1``; negative points are left out.
    rows
        Number of samples.
    """
    size, passing = number(gradations["size_mm"]), number(gradations["passing_pct"])
    at = np.asarray(row, dtype=np.int64)
    keep = (at >= 0) & ~np.isnan(size) & ~np.isnan(passing)
    size, passing, at = size[keep], passing[keep], at[keep]
    order = np.lexsort((passing, size, at))
    return _curves(size[order], passing[order], at[order], rows)


def joined(parts: Curves, specimen: Ints, specimens: int) -> Curves:
    """Return one curve for each specimen from the curves of its rows.

    Parameters
    ----------
    parts
        Curves of the rows.
    specimen
        Position of the specimen of each row, 0 to ``specimens - 1``.
    specimens
        Number of specimens.
    """
    row = np.repeat(specimen, np.diff(parts.start))
    order = np.lexsort((parts.passing_pct, parts.size_mm, row))
    whole = _curves(parts.size_mm[order], parts.passing_pct[order], row[order], specimens)
    whole.is_rejected[specimen[parts.is_rejected]] = True
    return whole
