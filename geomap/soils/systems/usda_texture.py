"""USDA texture: class of the part finer than 2 mm by its sand, silt and clay.

Sand is 0.05 to 2 mm, silt 0.002 to 0.05 mm, clay finer. The three percentages are compared unrounded; the source
gives no rule for rounding.

References
----------
USDA, *Soil Survey Manual*, Agriculture Handbook 18 (2017), chapter 3, texture triangle. Sand, loamy sand, loam, clay
loam and clay as published, the other classes from memory; published wordings differ at some edges.
"""

from __future__ import annotations

import functools
from collections.abc import Mapping
from types import MappingProxyType
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils import precision, reasons, wording
from geomap.soils.precision import half_unit
from geomap.soils.records import Arrays, Floats, Reading, arrays, as_given, blocks, taken, whole

NAME = "usda_texture"
TITLE = "USDA texture"
SOURCE = "USDA Soil Survey Manual, Agriculture Handbook 18, chapter 3"
EDITION = "2017"
COLUMN = "usda_texture"

SIEVES = (
    *("passing_4_75_mm_pct", "passing_2_mm_pct", "passing_0_425_mm_pct", "passing_0_075_mm_pct"),
    *("passing_0_05_mm_pct", "passing_0_002_mm_pct"),
)
NEEDS = SIEVES

SYMBOLS = (
    *("sand", "loamy sand", "sandy loam", "loam", "silt loam", "silt"),
    *("sandy clay loam", "clay loam", "silty clay loam", "sandy clay", "silty clay", "clay"),
)
SYMBOL_NAMES: Mapping[str, str] = MappingProxyType({symbol: symbol for symbol in SYMBOLS})
BASES = ("lab",)

_GRID = 2  # points for one percent, where a size is missing and every texture between bounds is tried
_DECIMALS = 9  # of percentages after division, so that 15 % is not 14.999999999999998 %


def texture(sand_pct: Floats, clay_pct: Floats) -> NDArray[np.int8]:
    """Return the texture as a code of SYMBOLS, from 1; 0 where sand or clay is NaN.

    Parameters
    ----------
    sand_pct, clay_pct
        Percent of the part finer than 2 mm [%], one shape, each 0 to 100 and together at most 100; silt is the rest.

    Examples
    --------
    >>> [SYMBOLS[code - 1] for code in texture(np.array([30.0, 85.0]), np.array([30.0, 0.0]))]
    ['clay loam', 'loamy sand']
    """
    sand, clay = sand_pct, clay_pct
    silt = 100.0 - sand - clay
    classes = (
        (sand > 85) & (silt + 1.5 * clay < 15),
        (sand >= 70) & (sand <= 91) & (silt + 1.5 * clay >= 15) & (silt + 2 * clay < 30),
        ((clay >= 7) & (clay < 20) & (sand > 52) & (silt + 2 * clay >= 30))
        | ((clay < 7) & (silt < 50) & (sand > 43) & (silt + 2 * clay >= 30)),
        (clay >= 7) & (clay < 27) & (silt >= 28) & (silt < 50) & (sand <= 52),
        ((silt >= 50) & (clay >= 12) & (clay < 27)) | ((silt >= 50) & (silt < 80) & (clay < 12)),
        (silt >= 80) & (clay < 12),
        (clay >= 20) & (clay < 35) & (silt < 28) & (sand > 45),
        (clay >= 27) & (clay < 40) & (sand > 20) & (sand <= 45),
        (clay >= 27) & (clay < 40) & (sand <= 20),
        (clay >= 35) & (sand > 45),
        (clay >= 40) & (silt >= 40),
        (clay >= 40) & (sand <= 45) & (silt < 40),
    )
    result = np.zeros(np.shape(sand), dtype=np.int8)
    for code, is_class in enumerate(classes, start=1):
        result[is_class] = code
    return result


def codes(records: Mapping[str, NDArray[Any]]) -> NDArray[np.int8]:
    """Return the texture of each record as a code: k is ``SYMBOLS[k - 1]``, 0 is not determined.

    Parameters
    ----------
    records
        Columns of ``NEEDS`` by name, one length; an absent one was not tested.

    Examples
    --------
    >>> record = {"passing_2_mm_pct": [80.0], "passing_0_05_mm_pct": [40.0], "passing_0_002_mm_pct": [24.0]}
    >>> [SYMBOLS[code - 1] for code in codes(record)]
    ['sandy clay loam']
    """
    columns = arrays(records, NEEDS)
    result = np.zeros(len(columns[SIEVES[0]]), dtype=np.int8)
    for block in blocks(len(result)):
        result[block] = _judge(taken(columns, block), as_given)
    return result


def _judge(columns: Arrays, reading: Reading) -> NDArray[np.int8]:
    p2, p50, p002 = (columns[name] for name in (SIEVES[1], SIEVES[4], SIEVES[5]))
    is_whole = (p2 > 0) & (p50 <= p2) & (p002 <= p50)
    share = np.divide(100.0, p2, out=np.full(len(p2), np.nan), where=is_whole)
    sand, clay = np.round(100.0 - p50 * share, _DECIMALS), np.round(p002 * share, _DECIMALS)
    result = texture(reading(sand), reading(clay))
    rows = np.flatnonzero(~is_whole)
    if len(rows):
        masks = possible(taken(columns, rows))
        single = (masks > 0) & ((masks & (masks - np.uint16(1))) == 0)
        result[rows] = np.where(single, np.log2(np.maximum(masks, 1)) + 1, 0)
    return result


@functools.cache
def _classes_up_to() -> NDArray[np.int64]:
    """Return how many points of a half-percent grid belong to each class, summed from 0 up to each sand and clay."""
    steps = 100 * _GRID + 1
    sand, clay = np.meshgrid(np.arange(steps) / _GRID, np.arange(steps) / _GRID, indexing="ij")
    code = np.where(sand + clay <= 100.0, texture(sand, clay), 0)
    counts = np.zeros((len(SYMBOLS), steps + 1, steps + 1), dtype=np.int64)
    for k in range(len(SYMBOLS)):
        counts[k, 1:, 1:] = (code == k + 1).cumsum(axis=0).cumsum(axis=1)
    return counts


def possible(columns: Arrays) -> NDArray[np.uint16]:
    """Return the textures left, as bits, where a size is missing: it lies between its finer and coarser neighbors.

    No bit is left where a finer size passes more than a coarser one, or nothing passes 2 mm.
    """
    p4, p2, p40, p200, p50, p002 = (columns[name] for name in SIEVES)
    least_50 = np.fmax(p50, np.fmax(p002, 0.0))
    least_2 = np.fmax(p2, np.fmax.reduce([p40, p200, least_50]))
    most_2 = np.where(np.isnan(p2), np.fmin(p4, 100.0), p2)
    most_50 = np.where(np.isnan(p50), np.fmin.reduce([p200, p40, most_2]), p50)
    least_002, most_002 = np.fmax(p002, 0.0), np.where(np.isnan(p002), most_50, p002)
    is_odd = (least_002 > most_50) | (least_50 > most_2) | (least_2 > most_2) | ~(most_2 > 0)
    low, high = np.maximum(least_2, 1e-6), np.maximum(most_2, 1e-6)
    sand_low, sand_high = 100.0 - 100.0 * np.minimum(most_50 / low, 1.0), 100.0 - 100.0 * least_50 / high
    clay_low, clay_high = 100.0 * least_002 / high, 100.0 * np.minimum(most_002 / low, 1.0)
    s0, c0 = (np.clip(np.floor(v * _GRID + 1e-6), 0, 100 * _GRID).astype(np.int64) for v in (sand_low, clay_low))
    s1, c1 = (np.clip(np.ceil(v * _GRID - 1e-6), 0, 100 * _GRID).astype(np.int64) + 1 for v in (sand_high, clay_high))
    result = np.zeros(len(p2), dtype=np.uint16)
    for k, count in enumerate(_classes_up_to()):
        found = count[s1, c1] - count[s0, c1] - count[s1, c0] + count[s0, c0]
        result |= np.where((found > 0) & ~is_odd, np.uint16(1 << k), np.uint16(0))
    return result


def classify(records: pd.DataFrame, *, with_reasons: bool = True) -> pd.DataFrame:
    """Return the texture and what stands behind it, on the index of `records`.

    Parameters
    ----------
    records
        Columns of ``NEEDS``; an absent one was not tested.
    with_reasons
        Add ``usda_texture_reason`` (why there is no class) and ``usda_texture_candidates`` (the classes left, where
        there are several and at least one is ruled out).

    Returns
    -------
    Columns ``usda_texture, usda_texture_basis``, the two above, and ``usda_texture_near_limit``: the class would
    differ with sand and clay in whole percent, or with percent passing 2, 0.05 or 0.002 mm moved by 0.5, both as
    computed and with sand and clay in whole percent.
    """
    columns = arrays(records, NEEDS)
    code = codes(columns)
    table = pd.DataFrame(
        {
            "usda_texture": wording.categories(code, SYMBOLS),
            "usda_texture_basis": wording.categories((code > 0).astype(np.int8), BASES),
        },
        index=records.index,
    )
    if with_reasons:
        rows = np.flatnonzero(code == 0)
        part = taken(columns, rows)
        masks = np.zeros(len(code), dtype=np.uint16)
        masks[rows] = possible(part)
        is_untested = np.logical_and.reduce([np.isnan(part[name]) for name in SIEVES])
        is_gravel = part[SIEVES[1]] == 0
        disagree = (masks[rows] == 0) & ~is_untested & ~is_gravel
        cases = {
            "untested, no visual": is_untested,
            "sieves disagree": disagree,
            "no fine part": is_gravel,
            "no fine curve": ~is_untested & ~disagree & ~is_gravel,
        }
        bits = np.zeros(len(code), dtype=np.uint64)
        bits[rows] = reasons.marked(len(rows), cases)
        masks[masks == (1 << len(SYMBOLS)) - 1] = 0
        table["usda_texture_reason"] = reasons.column(bits)
        table["usda_texture_candidates"] = wording.candidates(masks, SYMBOLS)
    everywhere = np.ones(len(code), dtype=bool)
    moves = [half_unit(SIEVES[place], everywhere) for place in (1, 4, 5)]
    is_near = precision.near_limit(columns, code, moves, _judge, other=whole)
    table["usda_texture_near_limit"] = precision.flags(is_near, code > 0)
    return table
