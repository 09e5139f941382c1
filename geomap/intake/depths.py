"""Intake of depths: samples and strata against their own two depths, their hole, and each other."""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.intake.entries import Entries, Flags, Intake, Texts
from geomap.tables.findings import Check

DEPTH_TOLERANCE_M = 0.01  # depths are written to the centimeter
STRATUM_TOLERANCE_M = 0.05  # strata are logged to 0.05 m; common practice, no source
DRIVEN_BELOW_HOLE_M = 0.6  # a drive sampler goes about 0.45 m below the bored hole; common practice, no source
LEVEL_MARGIN_M = 1.0  # how far a level may lie outside the hole and still be taken for a level

LEVEL_AS_DEPTH = Check(
    "level given as depth",
    "query",
    "depth below ground",
    "the entry fits between the ground level and the bottom of the hole; the row is left out until the depth is given",
)
SWAPPED = Check(
    "top below base",
    "reject",
    "a base below the top",
    "the row is left out; if the two depths are swapped, change them back",
)
NO_THICKNESS = Check(
    "stratum of no thickness",
    "reject",
    "a base below the top",
    "the row is left out; correct its top or base, or remove the row",
)
ZERO_BASE = Check(
    "base depth of zero",
    "reject",
    "a base below the top",
    "read as no base depth; leave the cell blank where none is known",
)
BELOW_HOLE = Check(
    "below the end of the hole",
    "reject",
    "depths within the final depth of the boring",
    "the row is left out; check its depth, its unit and the final depth of the boring",
)
BASE_BELOW_HOLE = Check(
    "base below the end of the hole",
    "query",
    "depths within the final depth of the boring",
    "the row is used as it is; check its base and the final depth of the boring",
)
OVERLAP = Check(
    "strata overlap", "query", "a top at the base of the stratum above", "both are used; correct top or base"
)
GAP = Check(
    "gap between strata", "query", "strata that follow each other from ground level to the end of the hole",
    "the gap is taken as not logged; add the missing stratum or correct top or base",
)  # fmt: skip


def within_hole(intake: Intake) -> Intake:
    """Judge the top and base of samples and strata, alone and against the hole they belong to."""
    for table in ("samples", "strata"):
        if table in intake and len(intake[table].rows):
            intake = _own_depths(intake, intake[table])
            if "borings" in intake:
                intake = _against_hole(intake, intake[table])
    return intake


def _own_depths(intake: Intake, entries: Entries) -> Intake:
    top, base = entries.numbers("top_depth_m"), entries.numbers("base_depth_m")
    ground, depth = _hole(intake, entries)
    in_hole = (top >= ground - depth - LEVEL_MARGIN_M) & (top <= ground + LEVEL_MARGIN_M)
    upside_down = base < top - DEPTH_TOLERANCE_M
    no_base = entries.used & (base == 0) & (top > 0)
    upside_down &= ~no_base
    level = entries.used & in_hole & (_most_of_boring(entries, upside_down) | (top > depth + DEPTH_TOLERANCE_M))
    swapped = entries.used & upside_down & ~level
    # A sample may be a point; a layer may not.
    thin = entries.used & (base <= top) & ~(no_base | level | swapped) & (entries.layout == "strata")
    pair = ("top_depth_m", "base_depth_m")
    parts = [
        entries.findings_of(LEVEL_AS_DEPTH, level, *pair),
        entries.findings_of(SWAPPED, swapped, *pair),
        entries.findings_of(NO_THICKNESS, thin, *pair),
        entries.findings_of(ZERO_BASE, no_base, *pair),
    ]
    entries = entries.set_aside(no_base, "base_depth_m")
    entries = entries.leave_out(level, "level given as depth").leave_out(swapped, "top below base")
    entries = entries.leave_out(thin, "no thickness")
    if entries.layout == "strata":  # a stratum without a base is not a stratum
        entries = entries.leave_out(no_base, "base_depth_m missing or rejected")
    return intake.having(entries, *parts)


def _most_of_boring(entries: Entries, mask: Flags) -> Flags:
    """Return the rows of `mask` in borings where it holds for most rows, and at least two."""
    borings = entries.rows["boring"].fillna("")
    counted = pd.Series(mask & entries.used).groupby(borings)
    return mask & ((counted.transform("mean") > 0.5) & (counted.transform("sum") > 1)).to_numpy(dtype=bool)


def _against_hole(intake: Intake, entries: Entries) -> Intake:
    top, base = entries.numbers("top_depth_m"), entries.numbers("base_depth_m")
    _, depth = _hole(intake, entries)
    is_stratum = entries.layout == "strata"
    below = top >= depth if is_stratum else top > depth + DEPTH_TOLERANCE_M
    below = below & entries.used
    allowance = STRATUM_TOLERANCE_M if is_stratum else DRIVEN_BELOW_HOLE_M
    base_below = entries.used & ~below & (base > depth + allowance)
    found = _with_depth(entries.found("top_depth_m", "base_depth_m"), depth)
    parts = [
        entries.findings_of(BELOW_HOLE, below, "top_depth_m", "base_depth_m", found=found),
        entries.findings_of(BASE_BELOW_HOLE, base_below, "base_depth_m", found=found),
    ]
    return intake.having(entries.leave_out(below, "below the end of the hole"), *parts)


def _hole(intake: Intake, entries: Entries) -> tuple[NDArray[np.float64], NDArray[np.float64]]:
    """Return ground level and final depth of the hole of each row; NaN where not known."""
    unknown = np.full(len(entries.rows), np.nan)
    if "borings" not in intake:
        return unknown, unknown
    borings = intake["borings"]
    holes = borings.rows.loc[borings.used].drop_duplicates("boring").set_index("boring")
    of = holes.reindex(entries.rows["boring"].fillna(""))
    return of["ground_level_m"].to_numpy(dtype=float), of["depth_m"].to_numpy(dtype=float)


def _with_depth(found: Texts, depth: NDArray[np.float64]) -> Texts:
    ends = pd.Series(depth).map("; the hole ends at {:g} m".format).to_numpy(object)
    return np.asarray(found + ends, dtype=object)


def strata_follow(intake: Intake) -> Intake:
    """Ask where the strata of a boring overlap, or leave part of the hole without a stratum."""
    if "strata" not in intake or not intake["strata"].used.any():
        return intake
    strata = intake["strata"]
    _, depth = _hole(intake, strata)
    rows = strata.rows.assign(hole=depth).loc[strata.used].sort_values(["boring", "top_depth_m", "base_depth_m"])
    reached = rows.groupby("boring")["base_depth_m"].cummax()
    above = reached.groupby(rows["boring"]).shift().fillna(0.0)  # the first stratum begins at ground level
    is_last = ~rows["boring"].duplicated(keep="last")
    step = rows["top_depth_m"] - above
    at_end = rows["hole"] - reached
    overlap, gap = step < -STRATUM_TOLERANCE_M, step > STRATUM_TOLERANCE_M
    open_end = is_last & (at_end > STRATUM_TOLERANCE_M)
    parts = [
        _strata_findings(strata, OVERLAP, overlap, rows["top_depth_m"], above),
        _strata_findings(strata, GAP, gap, above, rows["top_depth_m"]),
        _strata_findings(strata, GAP, open_end, reached, rows["hole"]),
    ]
    return intake.having(strata, *parts)


def _strata_findings(strata: Entries, check: Check, mask: pd.Series, start: pd.Series, end: pd.Series) -> pd.DataFrame:
    if not mask.any():
        return pd.DataFrame()
    words = "two strata from {:g} to {:g} m" if check is OVERLAP else "no stratum from {:g} to {:g} m"
    found = pd.Series([words.format(a, b) for a, b in zip(start[mask], end[mask], strict=True)], mask.index[mask])
    index = strata.rows.index
    picked: Flags = mask.reindex(index, fill_value=False).to_numpy(dtype=bool)
    texts = found.reindex(index).to_numpy(object)
    return strata.findings_of(check, picked, "top_depth_m", "base_depth_m", found=texts)


CHECKS = (within_hole, strata_follow)
