"""ASTM D2487: the group name that goes with a symbol.

A name is a stem, what stands before it (sandy, gravelly), and what is said after "with": silt or clay of a dual
symbol, sand or gravel, organic fines, cobbles and boulders, in this order.

References
----------
ASTM D2487-17, Figs. 1a, 1b, 2, 3 and Table 1 notes B, F, H, I, K, L, M (H, M and the ties from memory). The place of
"organic fines" in the chain is not defined there; it is a project rule.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from geomap.soils.records import Flags, Floats
from geomap.soils.systems.astm_d2487_rules import CLAY_ZONES, ORGANIC, SILT_ZONES, SYMBOLS, ZONES, Sets

SECOND_PART = 15.0  # Figs. 1 to 3: from 15 % on, the lesser part is named
MUCH_COARSE = 30.0  # Fig. 1: from 30 % plus No. 200 on, "sandy" or "gravelly" stands first

_DUAL_ITEM = {"M": "silt", "C": "clay"}
_COARSE = {
    "GW": "well-graded gravel",
    "GP": "poorly graded gravel",
    "GM": "silty gravel",
    "GC": "clayey gravel",
    "SW": "well-graded sand",
    "SP": "poorly graded sand",
    "SM": "silty sand",
    "SC": "clayey sand",
    "GC-GM": "silty, clayey gravel",
    "SC-SM": "silty, clayey sand",
}
_FINE = {
    "CL": "lean clay",
    "CL-ML": "silty clay",
    "ML": "silt",
    "CH": "fat clay",
    "MH": "elastic silt",
    "OL": "organic clay",
    "OH": "organic clay",
    "PT": "peat",
}

# What the sand and gravel add, by modifier: words before the stem and item after "with".
_COARSE_MODIFIERS = 2  # 0 none; 1 the other of sand and gravel
_FINE_MODIFIERS = (
    ("", ""),
    ("", "sand"),
    ("", "gravel"),
    ("sandy ", ""),
    ("sandy ", "gravel"),
    ("gravelly ", ""),
    ("gravelly ", "sand"),
)
_STONES = ((), ("cobbles",), ("boulders",), ("cobbles", "boulders"))

# Second readings of a symbol: silty clay fines of a dual symbol, silt of an organic soil.
SILTY_CLAY = {"GW-GC", "GP-GC", "SW-SC", "SP-SC"}
ORGANIC_SILT = {"OL", "OH"}
_VARIANTS = [symbol for symbol in SYMBOLS if symbol in SILTY_CLAY | ORGANIC_SILT]
_FIRST_FINE = SYMBOLS.index("CL") + 1  # code; coarse symbols come before it
_FIRST_SAND = SYMBOLS.index("SW") + 1
_PEAT = SYMBOLS.index("PT") + 1


def chained(stem: str, items: Sequence[str]) -> str:
    """Return a stem with what is said after "with".

    Examples
    --------
    >>> chained("silty sand", []), chained("silty sand", ["gravel"])
    ('silty sand', 'silty sand with gravel')
    >>> chained("silty gravel", ["sand", "cobbles"])
    'silty gravel with sand and cobbles'
    >>> chained("poorly graded gravel", ["silt", "sand", "cobbles", "boulders"])
    'poorly graded gravel with silt, sand, cobbles, and boulders'
    """
    if len(items) < 3:
        return " with ".join([stem, " and ".join(items)] if items else [stem])
    return f"{stem} with {', '.join(items[:-1])}, and {items[-1]}"


def group_name(symbol: str, is_variant: bool, modifier: int, is_organic: bool, stones: int) -> str:
    """Return one name, or a blank for a combination that does not occur."""
    if symbol in _FINE:
        stem = _FINE[symbol].replace("clay", "silt") if is_variant else _FINE[symbol]
        before, item = _FINE_MODIFIERS[modifier]
        is_odd = is_organic or (symbol == "PT" and (modifier > 0 or stones > 0))
        return "" if is_odd else chained(before + stem, [*filter(None, [item]), *_STONES[stones]])
    base, _, second = symbol.partition("-")
    items = []
    if symbol in _COARSE:
        stem = _COARSE[symbol]
    else:
        stem = _COARSE[base]
        items.append("silty clay" if is_variant else _DUAL_ITEM[second[1]])
    if modifier >= _COARSE_MODIFIERS:
        return ""
    items += ["sand" if symbol[0] == "G" else "gravel"] * modifier
    return chained(stem, [*items, *["organic fines"] * is_organic, *_STONES[stones]])


_SHAPE = (len(SYMBOLS) + len(_VARIANTS), len(_FINE_MODIFIERS), 2, len(_STONES))  # of the table of all names


def _all_names() -> tuple[tuple[str, ...], NDArray[np.int16]]:
    """Return the distinct names, and the code of each combination (0 for one that does not occur)."""
    stems = [(symbol, False) for symbol in SYMBOLS] + [(symbol, True) for symbol in _VARIANTS]
    spelled = [
        group_name(*stems[stem], modifier, bool(organic), stones)
        for stem, modifier, organic, stones in np.ndindex(*_SHAPE)
    ]
    code = {name: k for k, name in enumerate(dict.fromkeys(filter(None, spelled)), start=1)}
    return tuple(code), np.array([code.get(name, 0) for name in spelled], dtype=np.int16)


NAMES, _CODE = _all_names()
_VARIANT_STEM = np.zeros(len(SYMBOLS) + 1, dtype=np.int16)
for _k, _symbol in enumerate(_VARIANTS):
    _VARIANT_STEM[SYMBOLS.index(_symbol) + 1] = len(SYMBOLS) + _k


def modifiers(code: NDArray[np.int8], p4: NDArray[np.float32], p200: NDArray[np.float32]) -> NDArray[np.int8]:
    """Return what sand and gravel add to the name (Figs. 1 to 3), from whole percentages.

    Parameters
    ----------
    code
        Codes of SYMBOLS, from 1.
    p4, p200
        Percent passing No. 4 and No. 200.
    """
    gravel, sand, coarse = 100 - p4, p4 - p200, 100 - p200
    lesser = np.where(code < _FIRST_SAND, sand, gravel)
    result = (lesser >= SECOND_PART).astype(np.int8)
    rows = np.flatnonzero(code >= _FIRST_FINE)
    gravel, sand, coarse = gravel[rows], sand[rows], coarse[rows]
    is_sandier = sand >= gravel  # a tie counts as sand: from memory, Fig. 1
    much = np.where(is_sandier, 3 + (gravel >= SECOND_PART), 5 + (sand >= SECOND_PART))
    some = np.where(is_sandier, 1, 2)
    result[rows] = np.where(coarse < SECOND_PART, 0, np.where(coarse < MUCH_COARSE, some, much))
    return result


def name_codes(
    code: NDArray[np.int8], found: Sets, cobbles_pct: Floats, boulders_pct: Floats
) -> tuple[NDArray[np.int16], Flags, Flags]:
    """Return the code of each group name, and why some are left open.

    Parameters
    ----------
    code
        Codes of SYMBOLS from the tests, from 1; 0 not determined.
    found
        The sets that the symbol came from.
    cobbles_pct, boulders_pct
        Percent of the field sample [%]; NaN means none reported.

    Returns
    -------
    Codes of NAMES, 0 without a name; whether percent passing No. 4 is wanted for it; whether the plasticity index
    is wanted, to tell organic clay from organic silt.
    """
    modifier = modifiers(code, found.p4_low, found.p200)
    unsure = np.flatnonzero(found.p4_low != found.p4_high)
    needs_no_4 = np.zeros(len(code), dtype=bool)
    needs_no_4[unsure] = modifier[unsure] != modifiers(code[unsure], found.p4_high[unsure], found.p200[unsure])
    is_organic_soil = (code == SYMBOLS.index("OL") + 1) | (code == SYMBOLS.index("OH") + 1)
    is_silt, is_clay = (found.zones & SILT_ZONES) > 0, (found.zones & CLAY_ZONES) > 0
    needs_index = is_organic_soil & is_silt & is_clay
    is_variant = np.where(is_organic_soil, is_silt, found.zones == ZONES["CL-ML"]) & (_VARIANT_STEM[code] > 0)
    stem = np.where(is_variant, _VARIANT_STEM[code], code - np.int16(1))
    has_organic_fines = (found.organic == ORGANIC) & (found.p200 >= 5) & (code < _FIRST_FINE)
    stones = (cobbles_pct > 0).astype(np.int16) + np.int16(2) * (boulders_pct > 0)
    place = ((stem * _SHAPE[1] + modifier) * _SHAPE[2] + has_organic_fines) * _SHAPE[3] + stones
    is_open = (code == 0) | needs_no_4 | needs_index
    return np.where(is_open, np.int16(0), _CODE[np.where(is_open, 0, place)]), needs_no_4 & (code > 0), needs_index
