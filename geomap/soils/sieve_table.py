"""Sieve tables: gradation curves of samples that share their sizes, one column for each size.

The same answers as `geomap.soils.gradation.Curves`, several times faster where most cells are filled; rows with gaps
that matter are handed to it.
"""

from __future__ import annotations

import functools
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils.gradation import (
    BOUNDED,
    COBBLE_MM,
    INTERPOLATED,
    MEASURED,
    MISSING,
    ROUNDING_PCT,
    SAME_SIZE,
    Curves,
    Hows,
    Ints,
    Sizes,
)
from geomap.soils.records import Flags, Floats, number
from geomap.tables import schema


@dataclass(frozen=True)
class SieveTable:
    """Curves by column.

    Attributes
    ----------
    size_mm
        Sizes of the columns, ascending [mm].
    columns
        Percent passing each size [%], NaN for a gap.
    is_rejected
        Samples whose points were not used, as for `Curves`.
    """

    size_mm: Floats
    columns: tuple[Floats, ...]
    is_rejected: Flags

    def __len__(self) -> int:
        """Return the number of samples."""
        return len(self.is_rejected)

    @functools.cached_property
    def is_empty(self) -> Flags:
        """Samples without any point."""
        return np.asarray(np.isnan(self._coarsest))

    @functools.cached_property
    def _coarsest(self) -> Floats:
        # Percent passing never falls with size, so the greatest is that of the coarsest size.
        blank = np.full(len(self), np.nan)
        return functools.reduce(np.fmax, self.columns, blank)

    @functools.cached_property
    def _finest(self) -> Floats:
        return functools.reduce(np.fmin, self.columns, np.full(len(self), np.nan))

    def take(self, rows: NDArray[Any]) -> SieveTable:
        """Return the curves of some samples, in the order given."""
        return SieveTable(self.size_mm, tuple(column[rows] for column in self.columns), self.is_rejected[rows])

    def curves(self, rows: NDArray[Any]) -> Curves:
        """Return the curves of some samples point by point."""
        table = np.stack([column[rows] for column in self.columns], axis=1)
        known = ~np.isnan(table)
        size = np.broadcast_to(self.size_mm, table.shape)[known]
        start = np.concatenate([[0], np.cumsum(known.sum(axis=1))])
        return Curves(size, table[known], start, self.is_rejected[rows])

    def passing(self, size_mm: float) -> tuple[Floats, Hows]:
        """Return the percent passing a size, and how it was found; see `Curves.passing`."""
        place = int(np.searchsorted(self.size_mm, size_mm * (1 - SAME_SIZE)))
        if place == len(self.columns):
            return self._bounded(self._coarsest if place else np.full(len(self), np.nan), 100.0)
        if self.size_mm[place] <= size_mm * (1 + SAME_SIZE):
            pct = self.columns[place].copy()
            how = np.full(len(self), MEASURED, dtype=np.uint8)
        elif place == 0:
            return self._bounded(self._finest, 0.0)
        else:
            low, high = self.columns[place - 1], self.columns[place]
            finer, coarser = self.size_mm[place - 1], self.size_mm[place]
            pct = low + (high - low) * (np.log(size_mm / finer) / np.log(coarser / finer))
            how = np.where(low == high, np.uint8(BOUNDED), np.uint8(INTERPOLATED))
        gaps = np.flatnonzero(np.isnan(pct))
        if len(gaps):
            pct[gaps], how[gaps] = self.curves(gaps).passing(size_mm)
        return pct, how

    @staticmethod
    def _bounded(end: Floats, value: float) -> tuple[Floats, Hows]:
        reaches = end == value
        return np.where(reaches, value, np.nan), np.where(reaches, np.uint8(BOUNDED), np.uint8(MISSING))

    def size(self, passing_pct: float | Floats) -> Sizes:
        """Return the size that a percentage of each sample is finer than; see `Curves.size`."""
        target = np.broadcast_to(np.asarray(passing_pct, dtype=np.float64), len(self))
        place = np.zeros(len(self), dtype=np.int64)
        has_gap = np.zeros(len(self), dtype=bool)
        for column in self.columns:
            place += column < target
            has_gap |= np.isnan(column)
        edge = np.concatenate([[0.0], np.minimum(self.size_mm, COBBLE_MM), [COBBLE_MM]])
        low, high = edge[place], edge[place + 1]
        size = np.full(len(self), np.nan)
        if self.columns:
            self._inside(size, np.flatnonzero(~has_gap), place, target)
        is_known = ~np.isnan(size)
        low[is_known] = high[is_known] = size[is_known]
        gaps = np.flatnonzero(has_gap)
        if len(gaps):
            found = self.curves(gaps).size(target[gaps])
            size[gaps], low[gaps], high[gaps] = found.size_mm, found.low_mm, found.high_mm
        return Sizes(size, low, high)

    def _inside(self, size: Floats, rows: Ints, place: Ints, target: Floats) -> None:
        """Fill in the sizes of rows without a gap, where they lie inside the curve."""
        at_end = rows[(place[rows] == 0)]
        size[at_end[self.columns[0][at_end] == target[at_end]]] = self.size_mm[0]
        rows = rows[(place[rows] > 0) & (place[rows] < len(self.columns))]
        coarser, wanted, log_size = place[rows], target[rows], np.log(self.size_mm)
        found = np.empty(len(rows))
        for at in range(1, len(self.columns)):
            here = np.flatnonzero(coarser == at)
            low, high = self.columns[at - 1][rows[here]], self.columns[at][rows[here]]
            share = (wanted[here] - low) / (high - low)
            found[here] = log_size[at - 1] + share * (log_size[at] - log_size[at - 1])
        size[rows] = np.exp(found)


def table_from_wide(samples: pd.DataFrame) -> SieveTable:
    """Return the curves in the columns of the passing family, one for each row.

    Examples
    --------
    >>> table = table_from_wide(pd.DataFrame({"passing_4_75_mm_pct": [90.0, None], "passing_0_075_mm_pct": 12.0}))
    >>> table.passing(4.75)[0].tolist()
    [90.0, nan]
    """
    names = schema.passing_columns(samples.columns)[::-1]
    sizes = np.array([schema.size_from_passing_column(name) for name in names], dtype=np.float64)
    columns = [number(samples[name]) for name in names]
    is_bad, is_uneven = np.zeros(len(samples), dtype=bool), np.zeros(len(samples), dtype=bool)
    finer = np.full(len(samples), np.nan)
    for column in columns:
        rise = finer - column
        is_bad |= (rise > ROUNDING_PCT) | (column < 0.0) | (column > 100.0)
        is_uneven |= rise > 0.0
        finer = np.where(np.isnan(column), finer, column)
    if is_uneven.any():
        coarser = np.full(len(samples), np.nan)
        for place in reversed(range(len(columns))):
            coarser = np.fmin(coarser, columns[place])
            columns[place] = np.where(is_uneven & ~np.isnan(columns[place]), coarser, columns[place])
    if is_bad.any():
        columns = [np.where(is_bad, np.nan, column) for column in columns]
    return SieveTable(sizes, tuple(columns), is_bad)
