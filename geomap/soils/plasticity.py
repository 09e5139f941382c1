"""Plasticity: whole limits, the plasticity chart, non-plastic soils and the organic ratio."""

from __future__ import annotations

import functools
from collections.abc import Callable
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import ArrayLike, NDArray

from geomap.soils.records import Arrays, Flags, Floats, Reading, whole

# ASTM D2487-17 Fig. 4. The slope is as published, the start of the horizontal part and the U-line from memory.
A_LINE_SLOPE = 0.73
A_LINE_FOOT_LL = 20.0
A_LINE_LEAST_PI = 4.0
U_LINE_SLOPE = 0.9
U_LINE_FOOT_LL = 8.0
U_LINE_LEAST_PI = 7.0
U_LINE_LEAST_LL = 16.0

ORGANIC_RATIO = 0.75  # ASTM D2487-17 section 3 and Table 1: below it the fines are organic

GREATEST_LIMIT = 500  # percent; no limit above it is looked for where one is missing

# Binary noise of a product such as 0.73 * (LL - 20); far below any reporting unit.
NOISE = 1e-9

Zones: TypeAlias = NDArray[np.uint16]
ZoneFunction: TypeAlias = Callable[[Floats, Floats], Zones]


def a_line(liquid_limit_pct: ArrayLike) -> Floats:
    """Return the plasticity index of the A-line.

    Parameters
    ----------
    liquid_limit_pct
        Liquid limit [%], any shape; 0 to 500.

    Notes
    -----
    ``PI = 4`` up to ``LL = 25.5``, then ``PI = 0.73 (LL - 20)``. A point on the line counts as clay.

    References
    ----------
    ASTM D2487-17, Fig. 4 (slope as published; the horizontal part from memory).

    Examples
    --------
    >>> a_line([20, 40, 50]).round(2).tolist()
    [4.0, 14.6, 21.9]
    """
    ll = np.asarray(liquid_limit_pct, dtype=np.float64)
    return np.maximum(A_LINE_LEAST_PI, A_LINE_SLOPE * (ll - A_LINE_FOOT_LL))


def u_line(liquid_limit_pct: ArrayLike) -> Floats:
    """Return the plasticity index of the U-line: a point above it, or left of LL 16, is to be verified.

    It checks data and limits no class.

    Parameters
    ----------
    liquid_limit_pct
        Liquid limit [%], any shape; 0 to 500.

    References
    ----------
    ASTM D2487-17, Fig. 4 (equation from memory).

    Examples
    --------
    >>> u_line([37, 16]).round(1).tolist()
    [26.1, 7.2]
    """
    ll = np.asarray(liquid_limit_pct, dtype=np.float64)
    return np.maximum(U_LINE_LEAST_PI, U_LINE_SLOPE * (ll - U_LINE_FOOT_LL))


def is_above_a_line(liquid_limit_pct: ArrayLike, plasticity_index_pct: ArrayLike) -> Flags:
    """Return whether points plot on or above the A-line, its horizontal part left to the caller's limit on PI.

    Examples
    --------
    >>> is_above_a_line([40, 40], [14.6, 14.5]).tolist()
    [True, False]
    """
    ll = np.asarray(liquid_limit_pct, dtype=np.float64)
    return np.asarray(np.asarray(plasticity_index_pct) + NOISE >= A_LINE_SLOPE * (ll - A_LINE_FOOT_LL))


def plasticity_index(liquid_limit_pct: ArrayLike, plastic_limit_pct: ArrayLike) -> Floats:
    """Return the plasticity index as the difference of the whole limits.

    Parameters
    ----------
    liquid_limit_pct, plastic_limit_pct
        Limits [%], broadcast together; NaN in, NaN out.

    Returns
    -------
    Plasticity index [%], 0 where the plastic limit reaches the liquid limit (non-plastic).

    References
    ----------
    ASTM D4318: limits are reported as whole numbers and PI = LL - PL (partly from memory).

    Examples
    --------
    >>> plasticity_index([38, 40.5, 20], [34.2, 20, 22]).tolist()
    [4.0, 21.0, 0.0]
    """
    ll = whole(np.asarray(liquid_limit_pct, dtype=np.float64))
    pl = whole(np.asarray(plastic_limit_pct, dtype=np.float64))
    return np.maximum(ll - pl, 0.0)


def is_organic(liquid_limit_pct: ArrayLike, oven_dried_pct: ArrayLike) -> Flags:
    """Return whether fines are organic: the liquid limit falls below 0.75 of itself on oven drying.

    Parameters
    ----------
    liquid_limit_pct, oven_dried_pct
        Liquid limit not dried and after oven drying [%]; where either is NaN the answer is false, for a soil
        without the test is taken as inorganic.

    References
    ----------
    ASTM D2487-17, Table 1 (strictly less).

    Examples
    --------
    >>> is_organic([37, 40, 40], [26, 30, np.nan]).tolist()
    [True, False, False]
    """
    ll = np.asarray(liquid_limit_pct, dtype=np.float64)
    return np.asarray(np.asarray(oven_dried_pct) < ORGANIC_RATIO * ll - NOISE)


def limits(columns: Arrays, reading: Reading = whole) -> tuple[Floats, Floats, Floats]:
    """Return liquid limit, plastic limit and plasticity index as a classification takes them.

    The index comes from the liquid and plastic limit where both are there, else from the report; a liquid limit
    that is missing beside the other two is their sum. Where the soil is non-plastic (so reported, or with an
    index of 0 or less) the index is 0, and a liquid limit that could not be had is 0 as well.

    Parameters
    ----------
    columns
        Arrays ``liquid_limit_pct``, ``plastic_limit_pct``, ``plasticity_index_pct`` and ``is_nonplastic``.
    reading
        `whole`, or `as_given` for the unrounded reading.

    References
    ----------
    ASTM D4318: NP where a limit cannot be run or PL >= LL (from memory).
    """
    ll = reading(columns["liquid_limit_pct"])
    pl = reading(columns["plastic_limit_pct"])
    pi = reading(columns["plasticity_index_pct"])
    difference = ll - pl
    ll = np.where(np.isnan(ll), pl + pi, ll)
    pi = np.where(np.isnan(difference), pi, difference)
    nonplastic = columns["is_nonplastic"] | (pi <= 0.0)
    if nonplastic.any():
        pi[nonplastic] = 0.0
        ll[nonplastic & np.isnan(ll)] = 0.0
    return ll, pl, pi


@functools.cache
def _zones_by_one_limit(zones: ZoneFunction) -> tuple[Zones, Zones, Zones]:
    """Return what stays possible when only the liquid limit, the index or the plastic limit is known."""
    ll, pi = np.meshgrid(np.arange(GREATEST_LIMIT + 1.0), np.arange(GREATEST_LIMIT + 1.0), indexing="ij")
    chart = np.where(pi <= ll, zones(ll.ravel(), pi.ravel()).reshape(ll.shape), 0).astype(np.uint16)
    by_plastic_limit = [np.bitwise_or.reduce(np.diagonal(chart, -pl)) for pl in range(GREATEST_LIMIT + 1)]
    return (
        np.bitwise_or.reduce(chart, axis=1),
        np.bitwise_or.reduce(chart, axis=0),
        np.array(by_plastic_limit, dtype=np.uint16),
    )


def possible_zones(ll: Floats, pl: Floats, pi: Floats, zones: ZoneFunction) -> Zones:
    """Return the zones of a chart that stay possible, as bits, for limits some of which may be missing.

    Parameters
    ----------
    ll, pl, pi
        As from `limits`; NaN where missing.
    zones
        The chart: for known liquid limit and index, one bit for the zone they plot in.

    Returns
    -------
    Bits of `zones`: one where both are known, none where the index is more than the liquid limit, several where
    a limit is missing and every whole value of it from 0 to 500 % is tried.
    """
    possible = zones(ll, pi)
    possible[pi > ll] = 0
    open_rows = np.flatnonzero(np.isnan(ll + pi))
    if not len(open_rows):
        return possible
    by_ll, by_pi, by_pl = _zones_by_one_limit(zones)
    found = np.full(len(open_rows), np.bitwise_or.reduce(by_ll), dtype=np.uint16)
    for limit, table in ((ll, by_ll), (pi, by_pi), (pl, by_pl)):
        values = limit[open_rows]
        known = ~np.isnan(values)
        found[known] &= table[_place(values[known])]
    possible[open_rows] = found
    return possible


def _place(values: Floats) -> NDArray[Any]:
    return np.clip(whole(values), 0, GREATEST_LIMIT).astype(np.int64)
