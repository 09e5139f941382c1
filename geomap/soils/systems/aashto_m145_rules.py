"""AASHTO M 145: the groups as sets that stay possible, and the group index.

Groups are tried in the order of the tables and the first that fits is taken. Where a test is missing, every group
that could be first for some value of it stays possible, one bit for each group.

References
----------
AASHTO M 145-91 (2021), Tables 1 and 2 = ASTM D3282 Tables 1 and 2.
"""

from __future__ import annotations

import functools
import itertools
from dataclasses import dataclass
from typing import Any, TypeAlias

import numpy as np
from numpy.typing import NDArray

from geomap.soils.plasticity import Zones, limits, possible_zones
from geomap.soils.records import Arrays, Flags, Floats, Reading, taken, whole

SYMBOLS = (
    *("A-1-a", "A-1-b", "A-3", "A-2-4", "A-2-5", "A-2-6", "A-2-7"),
    *("A-4", "A-5", "A-6", "A-7-5", "A-7-6", "A-8"),
)

# Greatest percent passing of each step of the tables; the next whole percent starts the next step.
NO_10_STEPS = (50.0,)
NO_40_STEPS = (30.0, 50.0)
NO_200_STEPS = (10.0, 15.0, 25.0, 35.0)
LIQUID_LIMIT_STEP = 40.0
INDEX_STEPS = (0.0, 6.0, 10.0)  # 0 is NP
A_7_5_BELOW_LL = 30.0  # A-7-5 where PI <= LL - 30

NO_GROUP_TEST = 5  # step of No. 200 where it is missing
_ZONES = 9  # index step, liquid limit step, and the two parts of A-7

ZERO, PLASTICITY_TERM, BOTH_TERMS, NONE = range(4)
INDEX_RULE = np.array([NONE, *[ZERO] * 5, *[PLASTICITY_TERM] * 2, *[BOTH_TERMS] * 5, NONE], dtype=np.int8)  # by code

Masks: TypeAlias = NDArray[np.uint16]
Steps: TypeAlias = NDArray[np.int16]


@dataclass(frozen=True)
class Found:
    """Codes of the groups, and for records without one the groups left, as bits."""

    code: NDArray[np.int8]
    open_rows: NDArray[Any]
    open_masks: Masks


def _group(no_10: int, no_40: int, no_200: int, zone: int) -> str:
    """Return the first group that fits one combination of steps, or a blank for none (Table 2, left to right)."""
    index, is_high = min(zone // 2, 3), zone % 2 == 1 or zone == 8
    if no_200 <= 1 and no_40 == 0 and no_10 == 0 and index <= 1:
        return "A-1-a"
    if no_200 <= 2 and no_40 <= 1 and index <= 1:
        return "A-1-b"
    if no_200 == 0 and no_40 == 2 and index == 0:
        return "A-3"
    kind = (5 if is_high else 4) if index < 3 else (7 if is_high else 6)
    if no_200 <= 3:
        return f"A-2-{kind}"
    if kind == 7:
        return "A-7-6" if zone == 8 else "A-7-5"
    return f"A-{kind}"


@functools.cache
def _first_groups() -> NDArray[np.int8]:
    """Return the code of the group for each step of No. 10, No. 40, No. 200, and zone."""
    shape = (len(NO_10_STEPS) + 1, len(NO_40_STEPS) + 1, len(NO_200_STEPS) + 1, _ZONES)
    return np.array([SYMBOLS.index(_group(*steps)) + 1 for steps in np.ndindex(*shape)], dtype=np.int8).reshape(shape)


@functools.cache
def _possible_groups() -> Masks:
    """Return the groups left for each set of steps of No. 10, No. 40 and No. 200 and each set of zones, as bits."""
    masks = (1 << (_first_groups().astype(np.int64) - 1)).astype(np.uint16)
    for axis in range(4):
        single = np.moveaxis(masks, axis, 0)
        members = np.arange(1 << len(single))[:, None] >> np.arange(len(single)) & 1 > 0
        unions = [np.bitwise_or.reduce(single[member], axis=0, initial=0) for member in members]
        masks = np.moveaxis(np.array(unions, dtype=np.uint16), 0, axis)
    return masks


def limit_zones(ll: Floats, pi: Floats) -> Zones:
    """Return the part of Table 2 that known limits fall in, one bit of nine."""
    index = sum(((pi > step).view(np.int8) for step in INDEX_STEPS), np.zeros(len(ll), dtype=np.int8))
    is_high = ll > LIQUID_LIMIT_STEP
    zone = 2 * index + is_high + ((index == 3) & is_high & (pi > ll - A_7_5_BELOW_LL))
    return np.asarray(np.left_shift(np.uint16(1), zone.astype(np.uint16)))


def _step(values: Floats, steps: tuple[float, ...]) -> Steps:
    result = np.zeros(len(values), dtype=np.int16)  # wide enough for a place in the table of groups
    for step in steps:
        result += values > step
    return result


def _steps_between(low: Floats, high: Floats, steps: tuple[float, ...]) -> NDArray[np.int64]:
    """Return the steps, as bits, that hold a whole percent from `low` to `high`."""
    edges = [-1.0, *steps, 100.0]
    result = np.zeros(len(low), dtype=np.int64)
    for k, (above, upto) in enumerate(itertools.pairwise(edges)):
        result |= ((high > above) & (low <= upto)).astype(np.int64) << k
    return result


def find(columns: Arrays, reading: Reading = whole) -> Found:
    """Return the group of each record of a block, and the groups left where the data do not decide.

    Parameters
    ----------
    columns
        The columns of ``NEEDS`` as arrays.
    reading
        `whole`, as classified, or `as_given`: unrounded.
    """
    p10, p40, p200 = (reading(columns[f"passing_{size}_mm_pct"]) for size in ("2", "0_425", "0_075"))
    ll, pl, pi = limits(columns, reading)
    zones = possible_zones(ll, pl, pi, limit_zones)
    no_200 = _step(p200, NO_200_STEPS)
    # The table of sets is too large for speed; a record that lacks nothing goes by its single steps.
    is_single = (zones != 0) & (zones & (zones - np.uint16(1)) == 0)
    is_decided = is_single & (p200 <= p40) & (p40 <= p10)
    is_decided |= is_single & (no_200 == len(NO_200_STEPS)) & ~(p40 < p200) & ~(p10 < np.fmax(p40, p200))
    zone = _PLACE_OF_BIT[zones]
    groups = _first_groups().ravel()
    place = (_step(p10, NO_10_STEPS) * 3 + _step(p40, NO_40_STEPS)) * 5 + no_200
    code = groups[place * _ZONES + zone]
    open_rows = np.flatnonzero(~is_decided)
    masks = _open_masks(taken(columns, open_rows), p10[open_rows], p40[open_rows], p200[open_rows], zones[open_rows])
    code[open_rows] = np.where(np.isnan(p200[open_rows]), 0, single_code(masks))
    return Found(code, open_rows, masks)


_PLACE_OF_BIT = np.zeros(1 << _ZONES, dtype=np.int16)
_PLACE_OF_BIT[1 << np.arange(_ZONES)] = np.arange(_ZONES)


def single_code(masks: Masks) -> NDArray[np.int8]:
    """Return the code of the only group left, or 0."""
    single = (masks > 0) & ((masks & (masks - np.uint16(1))) == 0)
    return np.asarray(np.where(single, np.log2(np.maximum(masks, 1)) + 1, 0).astype(np.int8))


def _open_masks(columns: Arrays, p10: Floats, p40: Floats, p200: Floats, zones: Zones) -> Masks:
    """Return the groups left: a missing sieve lies between its finer and its coarser neighbors."""
    if not len(p200):
        return np.zeros(0, dtype=np.uint16)
    p4 = whole(columns["passing_4_75_mm_pct"])
    p4 = np.where(p4 < np.fmax(p10, np.fmax(p40, p200)), np.nan, p4)
    full = np.full(len(p200), 100.0)
    low_200, high_200 = np.fmax(p200, 0.0), np.where(np.isnan(p200), np.fmin.reduce([p40, p10, p4, full]), p200)
    low_40, high_40 = np.fmax(p40, low_200), np.where(np.isnan(p40), np.fmin.reduce([p10, p4, full]), p40)
    low_10, high_10 = np.fmax(p10, low_40), np.where(np.isnan(p10), np.fmin(p4, full), p10)
    found: Masks = _possible_groups()[
        _steps_between(low_10, high_10, NO_10_STEPS),
        _steps_between(low_40, high_40, NO_40_STEPS),
        _steps_between(low_200, high_200, NO_200_STEPS),
        zones,
    ]
    found[is_contradictory(p10, p40, p200)] = 0
    return found


def is_contradictory(p10: Floats, p40: Floats, p200: Floats) -> Flags:
    """Return whether a coarser sieve passes less than a finer one."""
    return np.asarray((p40 < p200) | (p10 < np.fmax(p40, p200)))


def thousandths(f: Floats, ll: Floats, pi: Floats, is_partial: Flags) -> Floats:
    """Return the group index before rounding, times 1000: a whole number for whole F, LL and PI."""
    liquid_limit_term = np.where(is_partial, 0.0, 5.0 * ll * (f - 35.0))
    return np.asarray(liquid_limit_term + 10.0 * (f - 15.0) * (pi - 10.0))


def whole_index(index_thousandths: Floats) -> Floats:
    """Return the group index from thousandths: halves up, a negative one 0."""
    return np.asarray(np.maximum(np.floor((index_thousandths + 500.0 + 1e-6) / 1000.0), 0.0))


def bits_of(index_rule: int) -> np.uint16:
    """Return the groups with one rule for the index, as bits."""
    return bits_of_groups(*(SYMBOLS[k] for k in range(len(SYMBOLS)) if INDEX_RULE[k + 1] == index_rule))


def bits_of_groups(*groups: str) -> np.uint16:
    """Return groups as bits."""
    return np.uint16(sum(1 << SYMBOLS.index(group) for group in groups))
