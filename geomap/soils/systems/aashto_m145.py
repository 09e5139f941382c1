"""AASHTO M 145 (ASTM D3282): group and group index.

Percentages are of the part finer than 75 mm; they and the limits are taken in whole numbers, halves up. A-8 is given
by eye only.

References
----------
AASHTO M 145-91 (2021), *Standard Specification for Classification of Soils and Soil-Aggregate Mixtures for Highway
Construction Purposes*; ASTM D3282.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

from geomap.soils import precision, reasons, wording
from geomap.soils.plasticity import GREATEST_LIMIT, limits
from geomap.soils.precision import Move, half_unit, is_close
from geomap.soils.reasons import BIT, Bits
from geomap.soils.records import LIMITS, Arrays, Flags, Floats, Reading, arrays, as_given, blocks, taken, whole
from geomap.soils.systems import aashto_m145_rules as rules
from geomap.soils.systems.aashto_m145_rules import thousandths, whole_index

NAME = "aashto_m145"
TITLE = "AASHTO soil classification"
SOURCE = "AASHTO M 145 (ASTM D3282)"
EDITION = "1991 (2021)"
COLUMN = "aashto_group"
SYMBOLS = rules.SYMBOLS

SIEVES = ("passing_4_75_mm_pct", "passing_2_mm_pct", "passing_0_425_mm_pct", "passing_0_075_mm_pct")
NEEDS = (*SIEVES, *LIMITS, "is_nonplastic", "is_peat")

SYMBOL_NAMES: Mapping[str, str] = MappingProxyType(
    {
        **dict.fromkeys(("A-1-a", "A-1-b"), "stone fragments, gravel and sand"),
        "A-3": "fine sand",
        **dict.fromkeys(("A-2-4", "A-2-5", "A-2-6", "A-2-7"), "silty or clayey gravel and sand"),
        **dict.fromkeys(("A-4", "A-5"), "silty soils"),
        **dict.fromkeys(("A-6", "A-7-5", "A-7-6"), "clayey soils"),
        "A-8": "highly organic: peat, muck",
    }
)

BASES = ("lab", "visual")
_A_8 = SYMBOLS.index("A-8") + 1
_HIGH_FROM = rules.LIQUID_LIMIT_STEP + 1


def group_index(
    fines: ArrayLike, liquid_limit: ArrayLike, plasticity_index: ArrayLike, partial: ArrayLike = False
) -> Floats | float:
    """Return the group index.

    Parameters
    ----------
    fines
        Percent passing 0.075 mm [%].
    liquid_limit, plasticity_index
        Limits [%]; 0 for both where the soil is non-plastic and the liquid limit cannot be had.
    partial
        Take the plasticity term only: groups A-2-6 and A-2-7. One value, or one for each soil.

    Returns
    -------
    Whole numbers of 0 or more, without an upper limit, as float; NaN where a term is missing. A float for scalars.

    Notes
    -----
    ``GI = (F - 35)[0.2 + 0.005(LL - 40)] + 0.01(F - 15)(PI - 10)`` with all three in whole numbers, halves up; the
    result is rounded likewise (in thousandths, so without binary noise) and a negative one is 0. For silt-clay
    groups A-4 to A-7, and with `partial` for A-2-6 and A-2-7; the index of the other granular groups is 0.

    References
    ----------
    AASHTO M 145-91 (2021) and ASTM D3282, group index and its examples (examples from memory).

    Examples
    --------
    >>> group_index(55, 40, 25), group_index(60, 25, 1), group_index(30, 50, 30, partial=True)
    (10.0, 0.0, 3.0)
    >>> group_index([80, 45], [90, 50], [50, 10]).tolist()
    [46.0, 3.0]
    """
    f, ll, pi = (whole(np.asarray(value, dtype=np.float64)) for value in (fines, liquid_limit, plasticity_index))
    result = whole_index(thousandths(f, ll, pi, np.asarray(partial, dtype=bool)))
    return float(result) if result.ndim == 0 else result


def codes(records: Mapping[str, NDArray[Any]]) -> NDArray[np.int8]:
    """Return the group of each record as a code: k is ``SYMBOLS[k - 1]``, 0 is not determined.

    Parameters
    ----------
    records
        Columns of ``NEEDS`` by name, one length; an absent one was not tested.

    Examples
    --------
    >>> record = {"passing_2_mm_pct": [97.0], "passing_0_425_mm_pct": [59.4], "passing_0_075_mm_pct": [1.2],
    ...           "is_nonplastic": [True]}
    >>> [SYMBOLS[code - 1] for code in codes(record)]
    ['A-3']
    """
    columns = arrays(records, NEEDS)
    result = np.empty(len(columns["is_peat"]), dtype=np.int8)
    for block in blocks(len(result)):
        result[block] = _tested_codes(taken(columns, block), whole)
    result[columns["is_peat"]] = _A_8
    return result


def _tested_codes(columns: Arrays, reading: Reading) -> NDArray[np.int8]:
    return rules.find(columns, reading).code


def classify(records: pd.DataFrame, *, with_reasons: bool = True) -> pd.DataFrame:
    """Return group, group index and what stands behind them, on the index of `records`.

    Parameters
    ----------
    records
        Columns of ``NEEDS``; an absent one was not tested.
    with_reasons
        Add ``aashto_group_reason`` (why there is no group, or what was assumed) and ``aashto_group_candidates``
        (the groups left, where there are several).

    Returns
    -------
    Columns ``aashto_group, group_index, aashto_group_basis``, the two above, and ``aashto_group_near_limit``: as
    `geomap.soils.precision` defines it for the group, and also where the index ends exactly in .5 before rounding
    or would differ if computed from unrounded results. Text columns are categorical; blank is missing.

    Notes
    -----
    The index is given wherever it can be: also where the group is open and every group left has the same index, as
    0 with at most 15 % fines. A-8 has none.
    """
    columns = arrays(records, NEEDS)
    found = _find_all(columns)
    code, index = found.code.copy(), _index(columns, found)
    code[columns["is_peat"]] = _A_8
    index[columns["is_peat"]] = np.nan
    tested = np.where(columns["is_peat"], np.int8(0), found.code)
    no_index = np.isnan(index)
    table = pd.DataFrame(
        {
            "aashto_group": wording.categories(code, SYMBOLS),
            "group_index": pd.arrays.IntegerArray(np.where(no_index, 0, index).astype(np.int64), no_index),
            "aashto_group_basis": wording.categories(np.where(columns["is_peat"], 2, code > 0), BASES),
        },
        index=records.index,
    )
    if with_reasons:
        bits, masks = _explained(columns, found)
        table["aashto_group_reason"] = reasons.column(bits)
        table["aashto_group_candidates"] = wording.candidates(masks, SYMBOLS)
    is_near = precision.near_limit(columns, tested, _moves(columns), _tested_codes) | _is_index_near(
        columns, tested, index
    )
    table["aashto_group_near_limit"] = precision.flags(is_near, tested > 0)
    return table


def _find_all(columns: Arrays) -> rules.Found:
    """Return `rules.find` of any number of records, block by block."""
    rows = len(columns["is_peat"])
    starts = list(blocks(rows)) or [slice(0, 0)]
    parts = [rules.find(taken(columns, block)) for block in starts]
    return rules.Found(
        np.concatenate([part.code for part in parts]),
        np.concatenate([part.open_rows + block.start for part, block in zip(parts, starts, strict=True)]),
        np.concatenate([part.open_masks for part in parts]),
    )


def _index(columns: Arrays, found: rules.Found, reading: Reading = whole) -> Floats:
    """Return the group index, NaN where it cannot be told."""
    rule = rules.INDEX_RULE[found.code]
    f = reading(columns["passing_0_075_mm_pct"])
    ll, _, pi = limits(columns, reading)
    index = whole_index(thousandths(f, ll, pi, rule == rules.PLASTICITY_TERM))
    index[rule == rules.ZERO] = 0.0
    index[rule == rules.NONE] = np.nan
    rows = np.flatnonzero((found.code[found.open_rows] == 0) & (found.open_masks > 0))
    at = found.open_rows[rows]
    index[at] = _common_index(f[at], ll[at], pi[at], found.open_masks[rows])
    return index


def _common_index(f: Floats, ll: Floats, pi: Floats, masks: rules.Masks) -> Floats:
    """Return the index that every group left would have, NaN where they differ: the index grows with both limits."""
    zero = (masks & rules.bits_of(rules.ZERO)) > 0
    other = (masks & ~rules.bits_of(rules.ZERO)) > 0
    is_partial = f <= rules.NO_200_STEPS[-1]
    least_pi = np.where(np.isnan(pi), np.where(is_partial, rules.INDEX_STEPS[-1] + 1, 0.0), pi)
    most_ll = np.where(np.isnan(ll), float(GREATEST_LIMIT), ll)
    most_pi = np.where(np.isnan(pi), most_ll, pi)
    least_ll = np.where(np.isnan(ll), least_pi, ll)
    least = np.where(zero, 0.0, whole_index(thousandths(f, least_ll, least_pi, is_partial)))
    most = np.where(other, whole_index(thousandths(f, most_ll, most_pi, is_partial)), 0.0)
    return np.where(np.isnan(f) | (least != most), np.nan, least)


def _explained(columns: Arrays, found: rules.Found) -> tuple[Bits, rules.Masks]:
    """Return the reasons as bits, and the candidates of records that the tests do not decide."""
    is_peat, code = columns["is_peat"], found.code
    bits = reasons.marked(len(code), reasons.limit_notes(columns, (code > 0) & ~is_peat, _HIGH_FROM))
    bits[is_peat] |= BIT["peat"]
    masks = np.zeros(len(code), dtype=np.uint16)
    is_open = (code[found.open_rows] == 0) & ~is_peat[found.open_rows]
    rows, left = found.open_rows[is_open], found.open_masks[is_open]
    part = taken(columns, rows)
    is_untested = reasons.is_without_tests(part, SIEVES)
    masks[rows] = np.where(is_untested, 0, left)
    bits[rows] |= np.where(is_untested, BIT["untested, no visual"], _why_open(part, left))
    return bits, masks


def _why_open(columns: Arrays, left: rules.Masks) -> Bits:
    """Return what keeps the group of records open."""
    p10, p40, p200 = (whole(columns[name]) for name in SIEVES[1:])
    disagree, no_fines = rules.is_contradictory(p10, p40, p200), np.isnan(p200)
    ll, _, pi = limits(columns)
    no_limits = np.isnan(ll + pi) & ~disagree & ~no_fines
    a_1_a, coarse = rules.bits_of_groups("A-1-a"), rules.bits_of_groups("A-1-a", "A-1-b", "A-3")
    cases = {
        "no fines": no_fines & ~disagree,
        "sieves disagree": disagree,
        "index over limit": (pi > ll) & ~disagree,
        "no 2 mm": np.isnan(p10) & ~no_fines & ((left & a_1_a) > 0),
        "no 0.425 mm": np.isnan(p40) & ~no_fines & ((left & coarse) > 0),
    }
    nowhere: Flags = np.zeros(len(left), dtype=bool)
    return reasons.marked(len(left), cases | reasons.missing_limits(columns, no_limits, nowhere))


def _moves(columns: Arrays) -> list[Move]:
    """Return the results that decide the group, each with the records where its precision could matter."""
    p10, p40, p200 = (columns[name] for name in SIEVES[1:])
    ll, pl, pi = (columns[name] for name in LIMITS)
    pi = np.where(np.isnan(pl), pi, ll - pl)
    is_granular = p200 < 36.0
    # How far rounding and a move of half a unit can carry a limit, an index or their difference: 1, 1.5 and 1.5.
    on_table = is_close(ll, [rules.LIQUID_LIMIT_STEP], 1.1)
    for step, least_fines in zip(rules.INDEX_STEPS, (11.1, 26.1, np.inf), strict=True):
        on_table |= is_close(pi, [step], 1.6) & (p200 < least_fines)
    on_table |= (np.abs(pi - ll + rules.A_7_5_BELOW_LL) <= 1.6) & (p200 > 34.0) & (ll > 39.0)
    return [
        half_unit("passing_2_mm_pct", is_granular & is_close(p10, rules.NO_10_STEPS, 1.0)),
        half_unit("passing_0_425_mm_pct", is_granular & is_close(p40, rules.NO_40_STEPS, 1.0)),
        half_unit("passing_0_075_mm_pct", is_close(p200, rules.NO_200_STEPS, 1.0)),
        *precision.limit_moves(on_table),
    ]


def _is_index_near(columns: Arrays, tested: NDArray[np.int8], index: Floats) -> Flags:
    """Return whether the index of records with a group ends exactly in .5, or differs when nothing is rounded."""
    result = np.zeros(len(tested), dtype=bool)
    rule = rules.INDEX_RULE[tested]
    rows = np.flatnonzero((rule == rules.PLASTICITY_TERM) | (rule == rules.BOTH_TERMS))
    part, is_partial = taken(columns, rows), rule[rows] == rules.PLASTICITY_TERM
    exact = []
    for reading in (whole, as_given):
        ll, _, pi = limits(part, reading)
        exact.append(thousandths(reading(part["passing_0_075_mm_pct"]), ll, pi, is_partial))
    result[rows] = ((exact[0] % 1000.0 == 500.0) & (exact[0] > 0)) | (whole_index(exact[1]) != index[rows])
    return result
