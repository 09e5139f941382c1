"""Reasons: why there is no class or no name, and what was assumed, in plain words.

All systems say the same thing in the same words. A reason for a blank names what is missing and what to do.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import TypeAlias

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils import wording
from geomap.soils.records import LIMITS, Arrays, Flags, Floats, whole

Bits: TypeAlias = NDArray[np.uint64]

PHRASES: Mapping[str, str] = MappingProxyType(
    {
        # No tests at all, or a class by eye.
        "untested": "no usable laboratory tests and no visual group: test the gradation and the limits",
        "untested, no visual": "no usable laboratory tests: test the gradation and the limits",
        "not a symbol": "no usable laboratory tests, and the visual group is not one symbol of ASTM D2487: write one "
        "symbol, or test the gradation and the limits",
        "visual": "no usable laboratory tests: the symbol is the visual group",
        "peat": "highly organic by the visual group, or by the organic content set for the project",
        # Gradation.
        "no fines": "percent passing 0.075 mm (No. 200) is neither measured nor between two sizes of a usable curve, "
        "so no class is allowed: wash and sieve over 0.075 mm (ASTM D1140, D6913)",
        "sieves disagree": "a finer sieve passes more than a coarser one: check the lab sheet",
        "no 4.75 mm": "percent passing 4.75 mm (No. 4) is missing, so gravel or sand is open: report that sieve",
        "no 2 mm": "percent passing 2 mm (No. 10) is missing, so group A-1-a is open: report that sieve",
        "no 0.425 mm": "percent passing 0.425 mm (No. 40) is missing, so A-1 and A-3 are open: report that sieve",
        "no shape": "Cu and Cc do not decide well or poorly graded, because D10, D30 or D60 is missing or outside the "
        "curve: extend the gradation (below 0.075 mm by hydrometer, ASTM D7928)",
        "no fine curve": "percent passing 2, 0.05 and 0.002 mm do not decide the texture, because the curve does not "
        "reach them: run a hydrometer test (ASTM D7928)",
        "no fine part": "nothing passes 2 mm (No. 10), so there is no texture",
        # Limits.
        "no limits": "liquid and plastic limits are missing: test them, or report NP (ASTM D4318)",
        "no limits, few fines": "5 to 12 % fines and no limits: test them, report NP (ASTM D4318), or give a visual "
        "group that calls the fines silt or clay",
        "no liquid limit": "the liquid limit is missing: report it (ASTM D4318)",
        "no index": "plastic limit and plasticity index are missing: test them, or report NP (ASTM D4318)",
        "index over limit": "the plasticity index is more than the liquid limit: check the lab sheet",
        # A symbol without a name.
        "no name, no 4.75 mm": "no group name: it needs percent passing 4.75 mm (No. 4) to weigh sand against gravel",
        "no name, no index": "no group name: organic clay or organic silt depends on the plasticity index",
        # What was assumed.
        "by eye": "fines taken as silty or clayey from the visual group, since the limits do not tell",
        "oven only": "taken as inorganic: no liquid limit before drying to compare with the oven-dried one",
        "nonplastic, limit": "non-plastic with a liquid limit: the liquid limit decides the row of the chart or table",
        "index of zero": "a plasticity index of 0 is taken as non-plastic (ASTM D4318)",
        "index differs": "plasticity index taken as liquid less plastic limit; the reported one is 1 or more off",
    }
)
BIT = {name: np.uint64(1 << k) for k, name in enumerate(PHRASES)}


def marked(rows: int, cases: Mapping[str, Flags]) -> Bits:
    """Return reasons as bits: for each case, the records that it is true of.

    Examples
    --------
    >>> bits = marked(2, {"peat": np.array([False, True])})
    >>> list(column(bits))
    [nan, 'highly organic by the visual group, or by the organic content set for the project']
    """
    bits = np.zeros(rows, dtype=np.uint64)
    for name, is_so in cases.items():
        bits[is_so] |= BIT[name]
    return bits


def column(bits: Bits) -> pd.Categorical:
    """Return the column of texts that bits of `BIT` stand for; no bit is missing."""
    return wording.sentences(bits, tuple(PHRASES.values()))


def is_without_tests(columns: Arrays, gradation: tuple[str, ...]) -> Flags:
    """Return records with none of the columns of `gradation`, no limit, and no NP."""
    flags = [np.isnan(columns[name]) for name in (*gradation, *LIMITS)]
    return np.asarray(np.logical_and.reduce([*flags, ~columns["is_nonplastic"]]))


def missing_limits(columns: Arrays, are_wanted: Flags, is_few: Flags) -> dict[str, Flags]:
    """Return which limits are missing where they are wanted; `is_few` where a visual estimate would do as well."""
    no_ll = np.isnan(columns["liquid_limit_pct"])
    no_pi = np.isnan(columns["plasticity_index_pct"]) & np.isnan(columns["plastic_limit_pct"])
    neither = are_wanted & no_ll & no_pi
    return {
        "no limits": neither & ~is_few,
        "no limits, few fines": neither & is_few,
        "no liquid limit": are_wanted & no_ll & ~no_pi,
        "no index": are_wanted & ~no_ll & no_pi,
    }


def limit_notes(columns: Arrays, are_used: Flags, high_from: float) -> dict[str, Flags]:
    """Return what was assumed about the limits of records whose class used them.

    Parameters
    ----------
    columns
        Records as arrays.
    are_used
        Records whose class came from the limits.
    high_from
        Liquid limit from which a non-plastic soil is placed by it.
    """
    ll, pl, pi = (columns[name] for name in LIMITS)
    difference: Floats = whole(ll) - whole(pl)
    index = np.where(np.isnan(difference), whole(pi), difference)
    is_nonplastic = columns["is_nonplastic"] | (index <= 0)
    return {
        "nonplastic, limit": are_used & is_nonplastic & (whole(ll) >= high_from),
        "index of zero": are_used & ~columns["is_nonplastic"] & (index <= 0),
        "index differs": are_used & (np.abs(difference - pi) >= 1.0),
    }
