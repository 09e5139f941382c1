"""Intake of single measures: zeros that stand for no test, D sizes, and the coarse part of a sample."""

from __future__ import annotations

import numpy as np
import pandas as pd

from geomap.intake.entries import Flags, Intake, Texts
from geomap.tables.findings import Check

# Columns in which 0 cannot be a result: all soil holds some water, resists some current and has some size.
NEVER_ZERO = ("moisture_pct", "optimum_moisture_pct", "resistivity_ohm_cm", "ph", "d10_mm", "d30_mm", "d60_mm", "cc")
# Columns in which 0 is a rare result and a common way to write no test; common practice, no source.
SELDOM_ZERO = ("cbr_soaked_pct", "cbr_unsoaked_pct", "cbr_in_place_pct", "cbr_pct", "unconfined_kpa")
D_SIZES = ("d10_mm", "d30_mm", "d60_mm")
COEFFICIENT_TOLERANCE = 0.10  # D sizes are given to two figures; common practice, no source
SUM_TOLERANCE_PCT = 1.0  # rounding to whole percent

ZERO = Check("zero for no test", "reject", "a number above 0", "read as not tested; leave the cell blank")
SELDOM = Check("zero, or no test", "query", "a number above 0", "used as 0; clear the cell if the test was not made")
D_ORDER = Check(
    "D sizes out of order",
    "reject",
    "D10 at most D30 at most D60",
    "none of the three is used; check them against the curve",
)
CU_DIFFERS = Check(
    "Cu differs from the D sizes",
    "query",
    "Cu = D60 / D10, within a tenth",
    "Cu as reported is used; check it and the D sizes",
)
CC_DIFFERS = Check(
    "Cc differs from the D sizes",
    "query",
    "Cc = D30 squared / (D10 x D60), within a tenth",
    "Cc as reported is used; check it and the D sizes",
)
COARSE_SUM = Check(
    "cobbles and boulders above 100",
    "reject",
    "together at most 100",
    "neither is used; check both against the lab sheet",
)


def zeros(intake: Intake) -> Intake:
    """Reject zeros that cannot be results; ask about those that hardly are."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    parts = []
    for column in NEVER_ZERO:
        zero = (samples.numbers(column) == 0) & ~samples.bounded(column)
        parts.append(samples.findings_of(ZERO, zero, column))
        samples = samples.set_aside(zero, column)
    for column in SELDOM_ZERO:
        zero = (samples.numbers(column) == 0) & ~samples.bounded(column)
        parts.append(samples.findings_of(SELDOM, zero, column))
    return intake.having(samples, *parts)


def d_sizes(intake: Intake) -> Intake:
    """Reject D sizes that fall as the percentage rises; compare reported Cu and Cc with them."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    d10, d30, d60 = (samples.numbers(c) for c in D_SIZES)
    falling: Flags = (d10 > d30) | (d30 > d60) | (d10 > d60)
    parts = [samples.findings_of(D_ORDER, falling, *D_SIZES)]
    samples = samples.set_aside(falling, *D_SIZES)
    formed = {"cu": (CU_DIFFERS, d60 / d10), "cc": (CC_DIFFERS, d30**2 / (d10 * d60))}
    for column, (check, value) in formed.items():
        differs = ~falling & (np.abs(samples.numbers(column) / value - 1) > COEFFICIENT_TOLERANCE)
        if differs.any():
            parts.append(samples.findings_of(check, differs, column, found=_beside(samples.found(column), value)))
    return intake.having(samples, *parts)


def coarse_part(intake: Intake) -> Intake:
    """Reject cobbles and boulders that add to more than the whole sample."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    columns = ("cobbles_pct", "boulders_pct")
    above = samples.numbers(columns[0]) + samples.numbers(columns[1]) > 100 + SUM_TOLERANCE_PCT
    found = samples.findings_of(COARSE_SUM, above, *columns)
    return intake.having(samples.set_aside(above, *columns), found)


def _beside(found: Texts, value: np.ndarray) -> Texts:
    return np.asarray(found + pd.Series(value).map("; the D sizes give {:.3g}".format).to_numpy(object), dtype=object)


CHECKS = (zeros, d_sizes, coarse_part)
