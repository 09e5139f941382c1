"""Intake of gradation curves: percent passing must fall, or stay, as the size falls.

Sources: ASTM D6913 (results to 1 % or 0.1 %) and ASTM D2487 (0.075 mm sieve for fines), both from memory.
"""

from __future__ import annotations

import numpy as np
import pandas as pd

from geomap.intake.entries import Flags, Intake, Texts
from geomap.intake.gathering import EVERY_SEVERITY, gathered
from geomap.tables import schema
from geomap.tables.findings import Check

ROUNDING_PCT = 1.0  # results are given to whole percent (ASTM D6913 method A, from memory)
FINES_MM = 0.075  # No. 200 (ASTM D2487)
FINES_TOLERANCE_MM = 0.0005
LEAST_SIEVES_TO_PROPOSE = 3  # fewer points rise by chance

NOT_MONOTONE = Check(
    "passing rises as size falls",
    "reject",
    "percent passing that falls with the size",
    "the curve is left out; check sizes and percentages against the lab sheet",
)
RETAINED = Check(
    "percent retained given as passing",
    "reject",
    "percent passing that falls with the size",
    "the curve is left out; it rises as total percent retained would: enter 100 minus these values if so",
)
RETAINED_EACH = Check(
    "percent retained on each sieve given as passing",
    "reject",
    "percent passing that falls with the size",
    "the curve is left out; its values add to 100 as percent retained on each sieve would: enter percent passing",
)
WITH_CURVE = Check(
    "left out with its curve",
    "reject",
    "percent passing that falls with the size",
    "left out as its curve is; settle the finding about the curve",
    "note",
)
SMALL_RISE = Check(
    "passing rises by rounding",
    "query",
    "percent passing that falls with the size",
    "used as it is, within rounding of 1 %; check the two values",
)
NO_FINES = Check(
    "no fines sieve",
    "query",
    "a result at 0.075 mm, or on both sides of it",
    "used as far as it goes; a group that depends on fines cannot be given: ask the laboratory for the 0.075 mm result",
    "note",
)


def falling(intake: Intake) -> Intake:
    """Reject curves that rise as the size falls, and say what they look like."""
    if "gradations" not in intake or not intake["gradations"].used.any():
        return intake
    points = intake["gradations"]
    rows = points.rows.loc[points.used].sort_values(["sample_row", "size_mm"], ascending=[True, False], kind="stable")
    curve = rows["sample_row"].to_numpy(dtype=np.int64)
    passing = rows["passing_pct"].to_numpy(dtype=float)
    rise = np.where(np.diff(curve, prepend=-1) == 0, np.diff(passing, prepend=0.0), np.nan)
    by_curve = pd.DataFrame({"curve": curve, "rise": rise, "passing": passing}).groupby("curve")
    most, least = by_curve["rise"].transform("max").to_numpy(), by_curve["rise"].transform("min").to_numpy()
    number, total = by_curve["passing"].transform("size").to_numpy(), by_curve["passing"].transform("sum").to_numpy()
    bad = most > ROUNDING_PCT
    reversed_ = bad & (least >= 0) & (number >= LEAST_SIEVES_TO_PROPOSE)
    each = bad & ~reversed_ & (np.abs(total - 100) <= ROUNDING_PCT) & (number > LEAST_SIEVES_TO_PROPOSE)
    worst = rise == most  # the point that a finding names; the first of equal ones
    worst &= ~pd.DataFrame({"curve": curve, "worst": worst}).duplicated().to_numpy()
    small = ~bad & (rise > 0)
    words = _rises(rows)
    masks = {RETAINED: reversed_ & worst, RETAINED_EACH: each & worst, SMALL_RISE: small}
    masks[NOT_MONOTONE] = bad & ~reversed_ & ~each & worst
    every = points.rows.index
    found = pd.Series(words, rows.index).reindex(every).to_numpy(object)
    parts = [points.findings_of(c, _on(every, rows, m), "passing_pct", found=found) for c, m in masks.items()]
    others = _on(every, rows, bad & ~worst) & points.rows["in_layout"].to_numpy(dtype=bool)
    notes = [points.findings_of(WITH_CURVE, others, "boring", "sample")]
    parts.append(gathered(notes, limit=1, severities=EVERY_SEVERITY))
    points = points.leave_out(_on(every, rows, bad), "its gradation curve rises as the size falls")
    return intake.having(points, *parts)


def _rises(rows: pd.DataFrame) -> Texts:
    """Return, for each point in order, it and the next coarser one in words."""
    size, passing = rows["size_mm"].map("{:g}".format), rows["passing_pct"].map("{:g}".format)
    words = (
        passing
        + " passing "
        + size
        + " mm, but "
        + passing.shift().fillna("")
        + " passing "
        + size.shift().fillna("")
        + " mm"
    )
    return words.to_numpy(object)


def _on(every: pd.Index, rows: pd.DataFrame, mask: Flags) -> Flags:
    return pd.Series(mask, rows.index).reindex(every, fill_value=False).to_numpy(dtype=bool)


def fines_sieve(intake: Intake) -> Intake:
    """Ask about gradations that end above the sieve for fines."""
    if "gradations" not in intake or "samples" not in intake or not intake["gradations"].used.any():
        return intake
    points, samples = intake["gradations"], intake["samples"]
    rows = points.rows.loc[points.used]
    finest = rows.groupby(rows["sample_row"].astype("int64"))["size_mm"].min().reindex(samples.rows.index)
    open_end = samples.used & (finest > FINES_MM + FINES_TOLERANCE_MM).to_numpy(dtype=bool)
    found = ("finest sieve " + finest.map("{:g} mm".format)).to_numpy(object)
    name = schema.passing_column(FINES_MM)
    return intake.having(samples, samples.findings_of(NO_FINES, open_end, name, found=found))


CHECKS = (falling, fines_sieve)
