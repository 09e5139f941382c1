"""Properties of soils: tables of tests in, one record for each row out.

A record holds what classification and rating need, on one basis: percentages of the part finer than 75 mm, D sizes
inside the curve with bounds where they lie outside it, limits as reported.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils import gradation, specimens, wording
from geomap.soils.gradation import BOUNDED, INTERPOLATED, MEASURED, Curves, Hows, Sizes
from geomap.soils.precision import HALF_UNIT
from geomap.soils.records import LIMITS, Arrays, Flags, Floats, arrays, taken
from geomap.soils.sieve_table import SieveTable
from geomap.soils.systems.astm_d2487 import SYMBOLS
from geomap.tables import schema

NAMED_MM = (4.75, 2.0, 0.425, 0.075, 0.05, 0.002)  # limits of ASTM D2487, AASHTO M 145 and USDA
D_TARGETS = {"d10_mm": 10.0, "d30_mm": 30.0, "d60_mm": 60.0}
REPORTED = (*D_TARGETS, "cu", "cc")
TESTED = (*REPORTED, *LIMITS, "liquid_limit_oven_dried_pct", "organic_pct", "cobbles_pct", "boulders_pct")
GREATEST_CLEAN = 12.5  # percent fines that still round to 12 (ASTM D2487-17, Table 1)

_OTHER_SPELLINGS = {"GM-GC": "GC-GM", "SM-SC": "SC-SM", "ML-CL": "CL-ML"}  # order of older texts
_CODE_OF_SYMBOL = {symbol: code for code, symbol in enumerate(SYMBOLS, start=1)}
_PEAT = _CODE_OF_SYMBOL["PT"]


def describe(
    samples: pd.DataFrame,
    gradations: pd.DataFrame,
    tolerance_m: float | None = specimens.TOLERANCE_M,
    *,
    organic_limit_pct: float | None = None,
) -> pd.DataFrame:
    """Return the record of each sample; rows of one specimen share one record.

    Parameters
    ----------
    samples
        Layout ``samples``, index unique.
    gradations
        ``sample_row`` (index value in `samples`), ``size_mm`` [mm], ``passing_pct`` [%]; may be empty.
    tolerance_m
        Greatest gap between the depths of two rows that are taken as one specimen [m], 0 or more; None where every
        row is a specimen of its own.
    organic_limit_pct
        Organic content above which the project calls a soil peat [%]; None: only the visual group does.

    Returns
    -------
    On the index of `samples`: percent passing 4.75, 2, 0.425, 0.075, 0.05 and 0.002 mm, ``gravel_pct, sand_pct,
    fines_pct`` of the part finer than 75 mm; ``cobbles_pct, boulders_pct`` of the whole; D sizes, ``cu, cc`` and
    their bounds ``cu_low, cu_high, cc_low, cc_high``; limits, organic content, ``is_nonplastic, is_peat``,
    ``fines_by_eye, visual_code``; ``gradation_basis, specimen, specimen_basis``. Missing is NaN.
    """
    which = specimens.join(samples, gradations, tolerance_m)
    place = which["specimen"].to_numpy(dtype=np.int64) - 1
    count = int(place.max(initial=-1)) + 1
    row = samples.index.get_indexer(pd.Index(gradations["sample_row"]))
    curves = gradation.curves_from_long(gradations, row, len(samples))
    tests = _of_specimens(samples, place, count)
    record = properties(tests, gradation.joined(curves, place, count), organic_limit_pct=organic_limit_pct)
    return record.take(pd.Index(place)).set_axis(samples.index, axis=0).join(which)


def _of_specimens(samples: pd.DataFrame, place: NDArray[np.int64], count: int) -> pd.DataFrame:
    """Return one row for each specimen; of joined rows, the value of the one that has it."""
    first = np.full(count, len(samples), dtype=np.int64)
    np.minimum.at(first, place, np.arange(len(samples)))
    names = [name for name in (*TESTED, "is_nonplastic", "visual_group") if name in samples]
    table = samples[names].iloc[first].reset_index(drop=True)
    is_joined = np.bincount(place, minlength=count)[place] > 1
    if is_joined.any():
        joined = samples.loc[is_joined, names].groupby(place[is_joined])
        values = joined.first()
        if "is_nonplastic" in names:
            values["is_nonplastic"] = joined["is_nonplastic"].max()
        table.loc[values.index] = values
    return table


def properties(
    tests: pd.DataFrame, curves: Curves | SieveTable, *, organic_limit_pct: float | None = None
) -> pd.DataFrame:
    """Return the record of each row of tests with its curve.

    Parameters
    ----------
    tests
        Columns of `TESTED`, ``is_nonplastic``, ``visual_group``; absent ones were not tested.
    curves
        The curve of each row.
    organic_limit_pct
        As for `describe`.

    Returns
    -------
    The columns of `describe` without those of specimens, on the index of `tests`.
    """
    columns = arrays(tests, [*TESTED, "is_nonplastic"])
    over, how_over = curves.passing(gradation.COBBLE_MM)
    record, hows = _sieves(curves, over, NAMED_MM)
    p4, p200 = record[schema.passing_column(4.75)], record[schema.passing_column(0.075)]
    record |= {"gravel_pct": 100.0 - p4, "sand_pct": p4 - p200, "fines_pct": p200}
    record |= _oversize(columns, curves, over)
    record |= shape(columns, curves, over)
    record |= {name: columns[name] for name in (*LIMITS, "liquid_limit_oven_dried_pct", "organic_pct")}
    record |= _flags(tests, columns, organic_limit_pct)
    table = pd.DataFrame(record, index=tests.index)
    table["gradation_basis"] = _basis(columns, curves, hows, (over < 100.0, how_over == INTERPOLATED))
    return table


def essentials(
    tests: pd.DataFrame, curves: SieveTable, needs: Collection[str], *, organic_limit_pct: float | None = None
) -> pd.DataFrame:
    """Return those columns of `properties` that classification reads, and what a group name needs besides.

    D sizes, Cu and Cc are looked for only where they can decide and are not reported: up to 12 % fines.

    Parameters
    ----------
    tests, curves, organic_limit_pct
        As for `properties`.
    needs
        Record columns that the systems read.
    """
    columns = arrays(tests, [*TESTED, "is_nonplastic"])
    over, _ = curves.passing(gradation.COBBLE_MM)
    record, _ = _sieves(curves, over, [size for size in NAMED_MM if schema.passing_column(size) in needs])
    record |= _oversize(columns, curves, over)
    if "cu_low" in needs:
        is_open = np.isnan(columns["cu"]) | np.isnan(columns["cc"])
        rows = np.flatnonzero((record[schema.passing_column(0.075)] < GREATEST_CLEAN) & is_open)
        record |= {f"{name}_{end}": columns[name].copy() for name in ("cu", "cc") for end in ("low", "high")}
        record |= {name: columns[name].copy() for name in REPORTED}
        for name, values in shape(taken(columns, rows), curves.take(rows), over[rows]).items():
            record.setdefault(name, np.full(len(over), np.nan))[rows] = values
    record |= {name: columns[name] for name in needs if name in TESTED and name not in record}
    record |= _flags(tests, columns, organic_limit_pct)
    return pd.DataFrame(record, index=tests.index, copy=False)


def _sieves(curves: Curves | SieveTable, over: Floats, sizes: Iterable[float]) -> tuple[Arrays, dict[float, Hows]]:
    """Return percent passing the named sizes, of the part finer than 75 mm, and how each was found.

    Notes
    -----
    Percentages of a curve with material coarser than 75 mm are divided by its percent passing 75 mm (ASTM D2487-17,
    1.2 and Table 1 note A; the division from memory). A curve that does not tell about 75 mm is taken to be of that
    part already.
    """
    record: Arrays = {}
    hows = {}
    rows = np.flatnonzero(over < 100.0)
    share = np.divide(100.0, over[rows], out=np.full(len(rows), np.nan), where=over[rows] > 0)
    for size in sizes:
        pct, hows[size] = curves.passing(size)
        pct[rows] = np.minimum(pct[rows] * share, 100.0)
        record[schema.passing_column(size)] = pct
    return record, hows


def _flags(tests: pd.DataFrame, columns: Arrays, organic_limit_pct: float | None) -> Arrays:
    visual, by_eye = by_visual_group(tests)
    is_peat = visual == _PEAT
    if organic_limit_pct is not None:
        is_peat = is_peat | (columns["organic_pct"] > organic_limit_pct)
    return {
        "is_nonplastic": columns["is_nonplastic"],
        "is_peat": is_peat,
        "fines_by_eye": by_eye,
        "visual_code": visual,
    }


def _oversize(columns: Arrays, curves: Curves | SieveTable, over: Floats) -> Arrays:
    """Return cobbles and boulders as reported, else by the curve; a curve that ends at 75 mm says cobbles."""
    p300, _ = curves.passing(gradation.BOULDER_MM)
    below = np.where(np.isnan(p300), 100.0, p300)
    cobbles, boulders = columns["cobbles_pct"], columns["boulders_pct"]
    return {
        "cobbles_pct": np.where(np.isnan(cobbles), below - over, cobbles),
        "boulders_pct": np.where(np.isnan(boulders), 100.0 - p300, boulders),
    }


def shape(columns: Arrays, curves: Curves | SieveTable, over: Floats) -> Arrays:
    """Return D10, D30, D60, Cu and Cc, and bounds on Cu and Cc where a D size lies outside the curve.

    Notes
    -----
    ``Cu = D60 / D10``, ``Cc = D30^2 / (D10 D60)`` (ASTM D2487-17, section 3). Bounds follow from those of the D
    sizes: a size finer than the curve lies between 0 and its finest size, a coarser one between its coarsest and 75 mm.
    Without any curve or D size they are NaN. ``d10_low_mm, d10_high_mm`` and so on are the sizes that half a percent
    less and half a percent more is finer than, for `geomap.soils.precision`; where anything is reported, the D size.
    """
    scale = np.where(np.isnan(over), 1.0, over / 100.0) if (over < 100.0).any() else 1.0
    found = [_with_reported(curves.size(target * scale), columns[name]) for name, target in D_TARGETS.items()]
    d10, d30, d60 = found
    with np.errstate(divide="ignore", invalid="ignore"):
        cu_bounds = d60.low_mm / d10.high_mm, d60.high_mm / d10.low_mm
        cc_bounds = (
            d30.low_mm**2 / (d10.high_mm * d60.high_mm),
            d30.high_mm**2 / (d10.low_mm * d60.low_mm),
        )
        cu = _reported_or(columns["cu"], d60.size_mm / d10.size_mm)
        cc = _reported_or(columns["cc"], d30.size_mm**2 / (d10.size_mm * d60.size_mm))
    is_bare = curves.is_empty & np.logical_and.reduce([np.isnan(size.size_mm) for size in found])
    result: Arrays = {name: size.size_mm for name, size in zip(D_TARGETS, found, strict=True)}
    result |= {"cu": cu, "cc": cc}
    is_reported = ~np.logical_and.reduce([np.isnan(columns[name]) for name in REPORTED])
    for name, target in D_TARGETS.items():
        for end, step in (("low", -HALF_UNIT), ("high", HALF_UNIT)):
            moved = curves.size((target + step) * scale).size_mm
            result[name.replace("_mm", f"_{end}_mm")] = np.where(is_reported, result[name], moved)
    for name, value, bounds in (("cu", cu, cu_bounds), ("cc", cc, cc_bounds)):
        for end, bound in zip(("low", "high"), bounds, strict=True):
            known = np.where(is_bare, np.nan, np.maximum(bound, 1.0 if name == "cu" else 0.0))
            result[f"{name}_{end}"] = _reported_or(value, known)
    return result


def _with_reported(size: Sizes, reported: Floats) -> Sizes:
    return Sizes(*(_reported_or(reported, part) for part in (size.size_mm, size.low_mm, size.high_mm)))


def _reported_or(reported: Floats, other: Floats) -> Floats:
    return np.where(np.isnan(reported), other, reported)


def by_visual_group(tests: pd.DataFrame) -> tuple[NDArray[np.int8], NDArray[np.int8]]:
    """Return what the visual group says: the code of its symbol, and silt or clay for the fines.

    Parameters
    ----------
    tests
        With or without a text column ``visual_group``.

    Returns
    -------
    Codes of the symbols of ASTM D2487, 0 for a blank and -1 for a text that is no symbol, such as ``CL/CH``; and
    fines by eye, 0 unknown, 1 silt, 2 clay. A group that says silty and clayey at once leaves the fines unknown.

    Examples
    --------
    >>> [part.tolist() for part in by_visual_group(pd.DataFrame({"visual_group": ["sp-sm", "CL/CH", None, "GC"]}))]
    [[14, -1, 0, 8], [1, 0, 0, 2]]
    """
    if "visual_group" not in tests:
        return np.zeros(len(tests), dtype=np.int8), np.zeros(len(tests), dtype=np.int8)
    which, texts = pd.factorize(tests["visual_group"])
    symbols = [str(text).strip().upper().replace(" ", "") for text in texts]
    symbols = [_OTHER_SPELLINGS.get(symbol, symbol) for symbol in symbols]
    codes = [_CODE_OF_SYMBOL.get(symbol, -1) if symbol else 0 for symbol in symbols]
    by_eye = [_fines_by_eye(symbol) if code > 0 else 0 for symbol, code in zip(symbols, codes, strict=True)]
    return np.array([*codes, 0], dtype=np.int8)[which], np.array([*by_eye, 0], dtype=np.int8)[which]


def _fines_by_eye(symbol: str) -> int:
    fines = symbol.rpartition("-")[2]
    if symbol in ("CL-ML", "GC-GM", "SC-SM"):
        return 0
    return {"GM": 1, "SM": 1, "ML": 1, "MH": 1, "GC": 2, "SC": 2, "CL": 2, "CH": 2}.get(fines, 0)


def _basis(
    columns: Arrays, curves: Curves | SieveTable, hows: dict[float, Hows], over: tuple[Flags, Flags]
) -> pd.Categorical:
    """Return where the named sieves come from, as text."""
    sizes = list(hows)
    bits = np.zeros(len(curves), dtype=np.int64)
    for k, size in enumerate(sizes):
        bits |= hows[size].astype(np.int64) << (2 * k)
    at = 2 * len(sizes)
    for k, name in enumerate(REPORTED):
        bits |= (~np.isnan(columns[name])).astype(np.int64) << (at + k)
    for k, is_so in enumerate((*over, curves.is_rejected), start=at + len(REPORTED)):
        bits |= is_so.astype(np.int64) << k
    has_any = ~curves.is_empty | curves.is_rejected | ((bits >> at & 31) > 0)
    bits = np.where(has_any, bits | 1 << (at + 8), 0)

    def text(code: int) -> str:
        parts = []
        for how, words in ((MEASURED, "measured"), (INTERPOLATED, "interpolated"), (BOUNDED, "bounded by the curve")):
            held = [f"{size:g}" for k, size in enumerate(sizes) if code >> (2 * k) & 3 == how]
            parts += [f"{words}: {', '.join(held)} mm"] if held else []
        held = [name.removesuffix("_mm").capitalize() for k, name in enumerate(REPORTED) if code >> (at + k) & 1]
        parts += [f"reported: {', '.join(held)}"] if held else []
        is_over, is_between, is_rejected = (code >> (at + len(REPORTED) + k) & 1 for k in range(3))
        parts += ["divided by percent passing 75 mm" + " (interpolated)" * is_between] if is_over else []
        parts += ["curve not used: a finer size passes more than a coarser one"] if is_rejected else []
        return "; ".join(parts)

    return wording.texts_from(bits, text)
