"""Reporting precision: whether a class would differ within the precision of a result that decides it.

``near_limit`` is true where, everything else kept,

(a) the class from unrounded results differs from the class from results in whole numbers, or
(b) the class differs when one result alone is moved by half its reporting unit, up or down. That is 0.5 for a percent
    passing, a liquid limit, a plastic limit or a plasticity index, for they are reported in whole percent (ASTM D6913
    Method A, D4318, from memory); and 2 % of its value for Cu and Cc, which have no reporting unit (project rule).
    Where they come from a curve, they also take every value that D10, D30 and D60 allow between the sizes that half a
    percent less and half a percent more is finer than: no sieve result that moves by as much can carry them farther.
    The class of moved results is taken in whole numbers and unrounded; either counts, and so does losing the class. No
    result is moved so far that it contradicts another one: a finer sieve never passes more than a coarser one.

So a sieve result that is replaced by one with more digits, which rounds to it, changes no class unless ``near_limit``
said so. A class that the data do not decide, or that was given by eye, has no ``near_limit``.
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
    name
        The record column that is moved; records where it is missing are not tried.
    is_near
        Records whose class could differ; the others are not tried.
    variants
        Yields the columns with the result moved, up and down.
    """

    name: str
    is_near: Flags
    variants: Callable[[Arrays], Iterator[Arrays]]


SIEVES = (
    *("passing_0_002_mm_pct", "passing_0_05_mm_pct", "passing_0_075_mm_pct"),
    *("passing_0_425_mm_pct", "passing_2_mm_pct", "passing_4_75_mm_pct"),
)


def half_unit(name: str, is_near: Flags) -> Move:
    """Return the move of a result by half a percent, no farther than the results beside it allow."""

    def variants(columns: Arrays) -> Iterator[Arrays]:
        value = columns[name]
        least, most = _room(name, columns)
        yield {**columns, name: np.fmin(value + HALF_UNIT, np.fmax(most, value))}
        yield {**columns, name: np.fmax(value - HALF_UNIT, np.fmin(least, value))}

    return Move(name, is_near, variants)


def _room(name: str, columns: Arrays) -> tuple[Floats, Floats]:
    """Return what a result cannot fall below or exceed: a finer sieve passes no more, an index is within its limit."""
    least, most = np.zeros(len(columns[name])), np.full(len(columns[name]), np.inf)
    if name in SIEVES:
        place = SIEVES.index(name)
        least = np.fmax.reduce([least, *(columns[sieve] for sieve in SIEVES[:place] if sieve in columns)])
        most = np.fmin.reduce([most, *(columns[sieve] for sieve in SIEVES[place + 1 :] if sieve in columns)])
        return least, np.fmin(most, 100.0)
    ll, pl, pi = LIMITS
    if name == ll:
        least = np.where(np.isnan(columns[pl]), np.fmax(columns[pi], least), least)
    if name == pi:
        most = np.where(np.isnan(columns[pl]), np.fmin(columns[ll], most), most)
    return least, most


def small_share(names: tuple[str, ...], is_near: Flags) -> Move:
    """Return the move of a ratio, and of its bounds with it, by 2 % of its value."""

    def variants(columns: Arrays) -> Iterator[Arrays]:
        for factor in (1.0 + RATIO_SHARE, 1.0 - RATIO_SHARE):
            yield {**columns, **{name: columns[name] * factor for name in names}}

    return Move(names[0], is_near, variants)


def is_close(values: Floats, limits: Iterable[float], within: float) -> Flags:
    """Return whether values lie within a distance of one of the limits.

    Examples
    --------
    >>> is_close(np.array([11.2, 30.0]), [5, 12, 50], 1.0).tolist()
    [True, False]
    """
    return np.asarray(np.logical_or.reduce([np.abs(values - limit) <= within for limit in limits]))


def limit_moves(is_near: Flags) -> list[Move]:
    """Return the moves of the liquid limit, the plastic limit and the plasticity index."""
    return [half_unit(name, is_near) for name in LIMITS]


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
        at = np.flatnonzero(move.is_near[rows] & ~differs & ~np.isnan(subset[move.name]))
        if not len(at):
            continue
        part = taken(subset, at)
        for moved in move.variants(part):
            differs[at] |= (judge(moved, whole) != wanted[at]) | (judge(moved, as_given) != wanted[at])
    result[rows] = differs
    return result


def flags(values: Flags, is_known: Flags) -> pd.arrays.BooleanArray:
    """Return a yes or no column, missing where not known."""
    return pd.arrays.BooleanArray(values & is_known, ~is_known)
