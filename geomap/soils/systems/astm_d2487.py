"""ASTM D2487: group symbol and group name (Unified Soil Classification System).

Percentages are of the part finer than 75 mm; cobbles and boulders change the name only. Percent passing No. 4 and
No. 200 and the limits are taken in whole numbers, halves up, and gravel, sand and the coarse part are formed from
the whole percentages; Cu and Cc are compared unrounded (project rules where the standard is silent).

References
----------
ASTM D2487-17, *Standard Practice for Classification of Soils for Engineering Purposes*.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils import plasticity, precision, reasons, wording
from geomap.soils.precision import Move, half_unit, is_close, small_share
from geomap.soils.reasons import BIT, Bits
from geomap.soils.records import LIMITS, Arrays, Flags, Reading, arrays, blocks, taken, whole
from geomap.soils.systems import astm_d2487_names as names
from geomap.soils.systems import astm_d2487_rules as rules
from geomap.soils.systems.astm_d2487_rules import Sets

NAME = "astm_d2487"
TITLE = "Unified Soil Classification System"
SOURCE = "ASTM D2487"
EDITION = "2017"
COLUMN = "uscs_symbol"
SYMBOLS = rules.SYMBOLS

GRADATION = (
    *("passing_4_75_mm_pct", "passing_2_mm_pct", "passing_0_425_mm_pct", "passing_0_075_mm_pct"),
    *("cu_low", "cu_high", "cc_low", "cc_high", "d30_mm", "d60_mm"),
)
D_SIZES = ("d10_mm", "d30_mm", "d60_mm")
D_SIZE_ENDS = tuple(name.replace("_mm", f"_{end}_mm") for name in D_SIZES for end in ("low", "high"))
NEEDS = (
    *(*GRADATION, *LIMITS, "liquid_limit_oven_dried_pct"),
    *("is_nonplastic", "is_peat", "fines_by_eye", "visual_code"),
)

SYMBOL_NAMES: Mapping[str, str] = MappingProxyType(
    {
        **{symbol: names.group_name(symbol, False, 0, False, 0) for symbol in SYMBOLS},
        "OL": "organic clay or organic silt, liquid limit below 50",
        "OH": "organic clay or organic silt, liquid limit 50 or more",
    }
)

BASES = ("lab", "lab, fines by eye", "visual")
_PEAT = SYMBOLS.index("PT") + 1


def codes(records: Mapping[str, NDArray[Any]]) -> NDArray[np.int8]:
    """Return the symbol of each record as a code: k is ``SYMBOLS[k - 1]``, 0 is not determined.

    Parameters
    ----------
    records
        Columns of ``NEEDS`` by name, one length; an absent one was not tested. ``cu`` and ``cc`` stand for their
        bounds where these are absent.

    Examples
    --------
    >>> record = {"passing_4_75_mm_pct": [100.0, 45.0], "passing_0_075_mm_pct": [85.0, 8.0],
    ...           "liquid_limit_pct": [42.0, 40.0], "plastic_limit_pct": [21.0, 20.0], "cu": [np.nan, 20.0],
    ...           "cc": [np.nan, 2.0]}
    >>> [SYMBOLS[code - 1] for code in codes(record)]
    ['CL', 'GW-GC']
    """
    columns = read(records)
    result = np.empty(len(columns["is_peat"]), dtype=np.int8)
    for block in blocks(len(result)):
        result[block] = _codes(taken(columns, block), whole)
    return result


def read(records: Mapping[str, NDArray[Any]] | pd.DataFrame) -> Arrays:
    """Return the columns of ``NEEDS`` as arrays; where the bounds of Cu or Cc are absent, Cu or Cc itself."""
    columns = arrays(records, NEEDS)
    for name in ("cu", "cc"):
        for bound in (f"{name}_low", f"{name}_high"):
            if bound not in records and name in records:
                columns[bound] = arrays(records, [name])[name]
    if "d30_mm" in records and "d60_mm" in records:
        columns["tie_low"] = columns["tie_high"] = (columns["d60_mm"] / columns["d30_mm"]) ** 2
    else:
        columns["tie_low"] = columns["tie_high"] = columns["d30_mm"] * np.nan
    return columns


def _codes(columns: Arrays, reading: Reading) -> NDArray[np.int8]:
    result = _tested_codes(columns, reading)
    rows = np.flatnonzero((result == 0) & (columns["visual_code"] > 0))
    if len(rows):
        rows = rows[reasons.is_without_tests(taken(columns, rows), GRADATION)]
        result[rows] = columns["visual_code"][rows]
    result[columns["is_peat"]] = _PEAT
    return result


def _tested_codes(columns: Arrays, reading: Reading) -> NDArray[np.int8]:
    return np.asarray(rules.tables()[1][rules.sets(columns, reading).place])


def classify(records: pd.DataFrame, *, with_reasons: bool = True) -> pd.DataFrame:
    """Return symbol, name and what stands behind them, on the index of `records`.

    Parameters
    ----------
    records
        Columns of ``NEEDS``, and ``cobbles_pct`` and ``boulders_pct`` for the name; an absent one was not tested.
    with_reasons
        Add ``uscs_symbol_reason`` (why there is no symbol or name, or what was assumed) and
        ``uscs_symbol_candidates`` (the symbols left, where there are several).

    Returns
    -------
    Columns ``uscs_symbol, uscs_name, uscs_symbol_basis``, the two above, and ``uscs_symbol_near_limit`` as
    `geomap.soils.precision` defines it. Text columns are categorical; blank is missing.

    Notes
    -----
    Laboratory tests govern. A record that its tests do not decide stays blank even where the visual group is one of
    the candidates; a record without any tests takes its visual group, without a name.
    """
    columns = read(records) | arrays(records, ("d10_mm", *D_SIZE_ENDS))
    found = rules.sets_of_all(columns)
    tested = rules.tables()[1][found.place]
    tested[columns["is_peat"]] = 0
    code = tested.copy()
    blank = np.flatnonzero(tested == 0)
    code[blank] = _codes(taken(columns, blank), whole)
    stones = arrays(records, ["cobbles_pct", "boulders_pct"])
    name, needs_no_4, needs_index = names.name_codes(tested, found, stones["cobbles_pct"], stones["boulders_pct"])
    name[code == _PEAT] = names.NAMES.index("peat") + 1
    name[(code == _PEAT) & ~columns["is_peat"]] = 0
    basis = np.where(tested > 0, 1 + found.is_by_eye, np.where(code > 0, 3, 0))
    table = pd.DataFrame(
        {
            "uscs_symbol": wording.categories(code, SYMBOLS),
            "uscs_name": wording.used_categories(name, names.NAMES),
            "uscs_symbol_basis": wording.categories(basis, BASES),
        },
        index=records.index,
    )
    if with_reasons:
        bits, masks = _explained(columns, found, tested, code)
        bits[needs_no_4] |= BIT["no name, no 4.75 mm"]
        bits[needs_index] |= BIT["no name, no index"]
        table["uscs_symbol_reason"] = reasons.column(bits)
        table["uscs_symbol_candidates"] = wording.candidates(masks, SYMBOLS)
    is_near = precision.near_limit(columns, tested, _moves(columns), _tested_codes)
    table["uscs_symbol_near_limit"] = precision.flags(is_near, tested > 0)
    return table


def _explained(
    columns: Arrays, found: Sets, tested: NDArray[np.int8], code: NDArray[np.int8]
) -> tuple[Bits, rules.Masks]:
    """Return the reasons as bits, and the candidates of records that the tests do not decide."""
    bits = _assumed(columns, found, tested)
    bits[columns["is_peat"]] |= BIT["peat"]
    masks = np.zeros(len(code), dtype=np.uint32)
    rows = np.flatnonzero((tested == 0) & ~columns["is_peat"])
    part = taken(columns, rows)
    is_untested, visual = reasons.is_without_tests(part, GRADATION), part["visual_code"]
    bits[rows] |= reasons.marked(
        len(rows),
        {
            "visual": is_untested & (visual > 0),
            "not a symbol": is_untested & (visual < 0),
            "untested": is_untested & (visual == 0),
        },
    )
    rows, part = rows[~is_untested], taken(part, ~is_untested)
    left = Sets(**{name: values[rows] for name, values in vars(found).items()})
    bits[rows] |= _why_open(part, left)
    masks[rows] = rules.tables()[0][left.place]
    no_fines = np.flatnonzero(left.band == rules.NO_FINES_TEST)
    masks[rows[no_fines]] = rules.possible_without_fines(taken(part, no_fines))
    return bits, masks


def _why_open(columns: Arrays, left: Sets) -> Bits:
    """Return what keeps the symbol of records open."""
    band, grading, zones = left.band, left.grading, left.zones

    def is_both(side: int) -> Flags:
        return np.asarray((grading & side) == side)

    several = (zones & (zones - np.uint16(1))) > 0
    is_few, by_zone = band == rules.DUAL, (band == rules.DIRTY) | (band == rules.FINE)
    cases = {
        "no fines": band == rules.NO_FINES_TEST,
        "sieves disagree": band == rules.CONTRADICTORY,
        "index over limit": (zones == 0) & (is_few | by_zone),
        "no 4.75 mm": (band <= rules.DIRTY) & ((grading & rules.GRAVEL) > 0) & ((grading & rules.SAND) > 0),
        "no shape": (band <= rules.DUAL) & (is_both(rules.GRAVEL) | is_both(rules.SAND)),
    }
    wanted = (is_few & rules.is_open(zones)) | (by_zone & several)
    return reasons.marked(len(band), cases | reasons.missing_limits(columns, wanted, is_few))


def _assumed(columns: Arrays, found: Sets, tested: NDArray[np.int8]) -> Bits:
    """Return what was assumed on the way to a symbol from tests."""
    are_used = (tested > 0) & (found.band >= rules.DUAL)
    oven, ll = columns["liquid_limit_oven_dried_pct"], columns["liquid_limit_pct"]
    cases = {
        "by eye": (tested > 0) & found.is_by_eye,
        "oven only": are_used & ~np.isnan(oven) & np.isnan(ll),
    }
    return reasons.marked(len(ll), cases | reasons.limit_notes(columns, are_used, rules.HIGH_PLASTICITY))


def _moves(columns: Arrays) -> list[Move]:
    """Return the results that decide the symbol, each with the records where its precision could matter."""
    p4, p200 = columns["passing_4_75_mm_pct"], columns["passing_0_075_mm_pct"]
    cu, cc = columns["cu_low"], columns["cc_low"]
    ll, pi, oven = columns["liquid_limit_pct"], columns["plasticity_index_pct"], columns["liquid_limit_oven_dried_pct"]
    pi = np.where(np.isnan(columns["plastic_limit_pct"]), pi, ll - columns["plastic_limit_pct"])
    is_coarse = p200 < 51.0
    half = is_coarse & (np.abs(100.0 - 2.0 * p4 + p200) <= 4.0)
    # How far rounding and a move of half a unit can carry a limit, an index, or the height above the A-line: 1, 1.5
    # and 1.4 (a move of the liquid limit nearly follows the line).
    height = pi - plasticity.A_LINE_SLOPE * (ll - plasticity.A_LINE_FOOT_LL)
    on_chart = (is_close(ll, [rules.HIGH_PLASTICITY], 1.1) & (p200 >= 49.0)) | (np.abs(height) <= 1.5)
    on_chart |= is_close(pi, [rules.HATCHED_FROM_PI, rules.HATCHED_TO_PI], 1.6) & (height >= -1.5)
    by_drying = np.abs(oven - plasticity.ORGANIC_RATIO * ll) <= 2.0
    by_limits = (p200 >= 4.0) & (on_chart | by_drying)
    by_shape = (p200 < 13.5) & ~np.isnan(p200)
    bounds = (("cu_low", "cu_high"), cu, [4, 6], 0.2), (("cc_low", "cc_high"), cc, [1, 3], 0.1)
    return [
        half_unit("passing_4_75_mm_pct", half),
        half_unit("passing_0_075_mm_pct", half | is_close(p200, [5, 12, 50], 1.0)),
        *(half_unit(name, is_coarse & np.isnan(p4)) for name in ("passing_2_mm_pct", "passing_0_425_mm_pct")),
        *precision.limit_moves(by_limits),
        half_unit("liquid_limit_oven_dried_pct", by_limits & by_drying),
        *(small_share(names, by_shape & is_close(value, limits, near)) for names, value, limits, near in bounds),
        _along_the_curve(columns, by_shape),
    ]


def _along_the_curve(columns: Arrays, by_shape: Flags) -> Move:
    """Return the move of D10, D30 and D60 between their ends, where it changes what the grading term can be."""
    rows = np.flatnonzero(by_shape)
    part = taken({name: columns[name] for name in (*rules.SHAPE, *D_SIZES, *D_SIZE_ENDS)}, rows)
    moved = _with_d_sizes_open(part)
    is_near = np.zeros(len(by_shape), dtype=bool)
    for least_cu in (rules.GRAVEL_LEAST_CU, rules.SAND_LEAST_CU):
        is_near[rows] |= rules.terms(part, least_cu) != rules.terms(moved, least_cu)
    return Move("cu_low", is_near, lambda columns: iter([_with_d_sizes_open(columns)]))


def _with_d_sizes_open(columns: Arrays) -> Arrays:
    """Return the columns with Cu and Cc bounded by all that D10, D30 and D60 can be between their ends."""
    share = {}
    for name in D_SIZES:
        size, at = columns[name], name.removesuffix("_mm")
        for end, outside in (("low", 0.0), ("high", np.inf)):
            found = columns[f"{at}_{end}_mm"] / size
            share[at, end] = np.where(np.isnan(size), 1.0, np.where(np.isnan(found), outside, found))
    with np.errstate(divide="ignore", invalid="ignore"):
        moved = {
            "cu_low": share["d60", "low"] / share["d10", "high"],
            "cu_high": share["d60", "high"] / share["d10", "low"],
            "cc_low": share["d30", "low"] ** 2 / (share["d10", "high"] * share["d60", "high"]),
            "cc_high": share["d30", "high"] ** 2 / (share["d10", "low"] * share["d60", "low"]),
            "tie_low": (share["d60", "low"] / share["d30", "high"]) ** 2,
            "tie_high": (share["d60", "high"] / share["d30", "low"]) ** 2,
        }
        return {**columns, **{name: columns[name] * factor for name, factor in moved.items()}}
