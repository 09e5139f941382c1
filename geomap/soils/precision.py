"""Reporting precision: whether a class would differ within the precision of a result that decides it.

``near_limit`` is true where, everything else kept,

(a) the class from unrounded results differs from the class from results in whole numbers, or
(b) the class differs when one result alone is moved by half its reporting unit, up or down: 0.5 for a percent
    passing, a liquid limit, a plastic limit or a plasticity index (reported in whole percent: ASTM D6913 Method A,
    D4318, from memory), 2 % of its value for Cu and Cc (project rule; they have no reporting unit). The class of
    the moved results is taken both in whole numbers and unrounded; either counts.

A class that the data do not decide, or that was given by eye, has no ``near_limit``.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils.records import LIMITS, Arrays, Flags, Floats, Reading, as_given, taken, whole

HALF_UNIT = 0.5  # percent; results are reported in whole percent
RATIO_SHARE = 0.02  # of Cu and Cc

# Judges records: arrays and a reading (`whole` or `as_given`) in, codes out.
Judge: TypeAlias = Callable[[Arrays, Reading], NDArray[Any]]


@dataclass(frozen=True)
class Move:
    """One result that is moved, and where a move could matter.

    Attributes
    ----------
    names
        The record columns that move together.
    is_near
        Records whose class could differ; the others are not tried.
    share
        Move by this share of the value; 0 for half a percent.
    """

    names: tuple[str, ...]
    is_near: Flags
    share: float = 0.0

    def both_ways(self, columns: Arrays) -> Iterator[Arrays]:
        """Yield the columns with this result moved up, and moved down."""
        for sign in (1.0, -1.0):
            factor, step = (1.0 + sign * self.share, 0.0) if self.share else (1.0, sign * HALF_UNIT)
            yield {**columns, **{name: columns[name] * factor + step for name in self.names}}


def is_close(values: Floats, limits: Iterable[float], within: float) -> Flags:
    """Return whether values lie within a distance of one of the limits.

    Examples
    --------
    >>> is_close(np.array([11.2, 30.0]), [5, 12, 50], 1.0).tolist()
    [True, False]
    """
    return np.asarray(np.logical_or.reduce([np.abs(values - limit) <= within for limit in limits]))


def limit_moves(is_near: Flags, oven_dried: Flags | None = None) -> list[Move]:
    """Return the moves of the liquid limit, the plastic limit and the plasticity index."""
    moves = [Move((name,), is_near) for name in LIMITS]
    return moves if oven_dried is None else [*moves, Move(("liquid_limit_oven_dried_pct",), oven_dried)]


def near_limit(
    columns: Arrays, codes: NDArray[Any], moves: Iterable[Move], judge: Judge, other: Reading = as_given
) -> Flags:
    """Return whether the class differs within the reporting precision, for records that have a class.

    Parameters
    ----------
    columns
        Records as arrays.
    codes
        Their classes by `judge`; 0 not determined.
    moves
        The results that decide the class.
    judge
        Gives the class of records.
    other
        The reading that the class was not taken in.
    """
    result = np.zeros(len(codes), dtype=bool)
    moves = list(moves)
    tried = np.logical_or.reduce([move.is_near for move in moves]) & (codes > 0)
    rows = np.flatnonzero(tried)
    subset, wanted = taken(columns, rows), codes[rows]
    differs = judge(subset, other) != wanted
    for move in moves:
        at = np.flatnonzero(move.is_near[rows] & ~differs & ~np.isnan(subset[move.names[0]]))
        if not len(at):
            continue
        part = taken(subset, at)
        for moved in move.both_ways(part):
            differs[at] |= (judge(moved, whole) != wanted[at]) | (judge(moved, as_given) != wanted[at])
    result[rows] = differs
    return result


def flags(values: Flags, is_known: Flags) -> pd.arrays.BooleanArray:
    """Return a yes or no column, missing where not known."""
    return pd.arrays.BooleanArray(values & is_known, ~is_known)
