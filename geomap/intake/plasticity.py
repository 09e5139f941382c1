"""Intake of liquid limit, plastic limit and plasticity index: the three are read together.

Sources: ASTM D4318 (whole numbers; NP where a limit cannot be run, or the plastic limit is at or above the
liquid limit) and ASTM D2487 (U-line), both from memory. Where liquid and plastic limit are both there, soils take
the plasticity index from them; the reported index is only compared.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.intake.entries import Entries, Flags, Intake
from geomap.intake.numbers import NONPLASTIC_CODE
from geomap.intake.words import NO
from geomap.tables.findings import Check

LIMITS = ("liquid_limit_pct", "plastic_limit_pct", "plasticity_index_pct")
PI_TOLERANCE = 1.0  # whole numbers may round apart by one; common practice, no source
LEAST_LIQUID_LIMIT = 16.0  # the U-line is vertical here (ASTM D2487, plasticity chart; from memory)
U_LINE_SLOPE, U_LINE_ORIGIN = 0.9, 8.0  # PI = 0.9 (LL - 8) (ASTM D2487, plasticity chart; from memory)

NP_IN_CODE = Check("NP in code", "convert", "a number or NP", "0 or -1 in these cells is read as non-plastic; write NP")
NP_BY_INDEX = Check(
    "plasticity index of zero",
    "query",
    "a number or NP",
    "read as non-plastic, the liquid limit kept; write NP if so, else give the index",
)
NP_BY_LIMITS = Check(
    "liquid and plastic limit equal",
    "query",
    "a liquid limit above the plastic limit, or NP",
    "read as non-plastic; write NP if so, else correct the limits",
)
NP_WITH_NUMBERS = Check(
    "NP beside plastic limits",
    "reject",
    "NP, or a liquid limit above the plastic limit",
    "neither is used; take NP or the numbers from the lab sheet",
)
NP_DENIED = Check(
    "NP against yes or no", "query", "NP and yes, or numbers and no", "read as non-plastic; correct one of the two"
)
LL_BELOW_PL = Check(
    "liquid limit below plastic limit",
    "reject",
    "a liquid limit above the plastic limit, or NP",
    "the limits are not used; if they are swapped change them back, and if the test gave no plasticity write NP",
)
PI_DIFFERS = Check(
    "plasticity index differs",
    "query",
    "liquid limit minus plastic limit, within 1",
    "the liquid and plastic limits in whole numbers govern; check all three against the lab sheet",
)
PI_ABOVE_LL = Check(
    "plasticity index not below liquid limit",
    "reject",
    "a plasticity index below the liquid limit",
    "the index is not used; check both against the lab sheet",
)
ZERO_LIMIT = Check(
    "limit of zero", "reject", "a number above 0, or NP", "read as not tested; leave the cell blank, or write NP"
)
NEGATIVE_LIMIT = Check(
    "negative limit", "reject", "a number above 0, or NP", "leave the cell blank where there is no result"
)
ABOVE_U_LINE = Check(
    "above the U-line",
    "query",
    "a plasticity index of at most 0.9 (LL - 8)",
    "natural soils hardly ever plot here; used as it is, check both limits against the lab sheet",
)
LOW_LIQUID_LIMIT = Check(
    "very low liquid limit",
    "query",
    "a liquid limit of 16 or more, or NP",
    "used as it is; check it against the lab sheet",
)
OVEN_ABOVE_LL = Check(
    "oven-dried liquid limit above the liquid limit",
    "query",
    "an oven-dried liquid limit at or below the other",
    "both are used; check that the two are not swapped",
)


def whole(values: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return percentages in whole numbers, halves up.

    Examples
    --------
    >>> whole(np.array([34.5, 35.4])).tolist()
    [35.0, 35.0]
    """
    return np.floor(values + 0.5 + 1e-9)  # a half that division left a hair short stays a half


def nonplastic(intake: Intake) -> Intake:
    """Read non-plastic soils that are given in code, and settle NP against numbers."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    liquid, plastic, index = (samples.numbers(c) for c in LIMITS)
    code_ll, code_pl, code_pi = ((v == 0) | (v == NONPLASTIC_CODE) for v in (liquid, plastic, index))
    minus = (liquid == NONPLASTIC_CODE) | (plastic == NONPLASTIC_CODE) | (index == NONPLASTIC_CODE)
    written = samples.rows["is_nonplastic"].fillna(False).to_numpy(dtype=bool)
    shown = (whole(liquid) > whole(plastic)) & (plastic > 0) | (index > 0)
    several = (code_ll.astype(int) + code_pl + code_pi) > 1  # a lone 0 may as well mean no test
    no_number = ~(liquid > 0) & ~(plastic > 0) & ~(index > 0)
    coded = (no_number & (several | minus)) | (written & ~shown & (code_ll | code_pl | code_pi))
    by_index = code_pi & ~(plastic > 0) & ~code_ll & ~coded
    equal = (liquid > 0) & (whole(liquid) == whole(plastic)) & ~(index > PI_TOLERANCE) & ~written
    parts = [
        samples.findings_of(NP_IN_CODE, coded, *LIMITS),
        samples.findings_of(NP_BY_INDEX, by_index, *LIMITS),
        samples.findings_of(NP_BY_LIMITS, equal, *LIMITS),
        samples.findings_of(NP_WITH_NUMBERS, written & shown, *LIMITS, "is_nonplastic"),
        samples.findings_of(NP_DENIED, written & ~shown & _denied(samples), *LIMITS, "is_nonplastic"),
    ]
    for column, code in zip(LIMITS, (code_ll, code_pl, code_pi), strict=True):
        samples = samples.set_aside(coded & code, column)
    samples = samples.set_aside(by_index | equal, *LIMITS[1:])
    samples = samples.with_values(coded | by_index | equal, "is_nonplastic", True)
    return intake.having(samples.set_aside(written & shown, *LIMITS, "is_nonplastic"), *parts)


def _denied(samples: Entries) -> Flags:
    """Return True where the file says no in its column for NP."""
    texts = pd.Series(samples.texts("is_nonplastic"), dtype="string")
    return texts.str.strip().str.lower().isin(NO).to_numpy(dtype=bool)


def impossible_limits(intake: Intake) -> Intake:
    """Reject limits of zero or less, and limits that contradict each other."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    liquid, plastic, index = (samples.numbers(c) for c in LIMITS)
    crossed = whole(liquid) < whole(plastic)
    crossed &= (liquid > 0) & ~samples.rows["is_nonplastic"].fillna(False).to_numpy(dtype=bool)
    parts = [samples.findings_of(LL_BELOW_PL, crossed, *LIMITS)]
    samples = samples.set_aside(crossed, *LIMITS)
    for column, values in (*zip(LIMITS, (liquid, plastic, index), strict=True), _oven(samples)):
        zero = (values == 0) & ~crossed
        if column == LIMITS[2]:  # an index of 0 is a result, unless it was formed with a liquid limit of 0
            zero &= liquid == 0
        negative = (values < 0) & ~crossed
        parts.append(samples.findings_of(ZERO_LIMIT, zero, column))
        parts.append(samples.findings_of(NEGATIVE_LIMIT, negative, column))
        samples = samples.set_aside(zero | negative, column)
    above = (index >= liquid) & (liquid > 0) & (index > 0) & ~crossed
    parts.append(samples.findings_of(PI_ABOVE_LL, above, *LIMITS))
    return intake.having(samples.set_aside(above, LIMITS[2]), *parts)


def _oven(samples: Entries) -> tuple[str, NDArray[np.float64]]:
    return "liquid_limit_oven_dried_pct", samples.numbers("liquid_limit_oven_dried_pct")


def index_agrees(intake: Intake) -> Intake:
    """Ask where the reported plasticity index is not the difference of the limits."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    liquid, plastic, index = (samples.numbers(c) for c in LIMITS)
    differs = np.abs(index - (whole(liquid) - whole(plastic))) > PI_TOLERANCE
    return intake.having(samples, samples.findings_of(PI_DIFFERS, differs, *LIMITS))


def unusual_limits(intake: Intake) -> Intake:
    """Ask about limits that natural soils hardly ever have."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    liquid, plastic, index = (samples.numbers(c) for c in LIMITS)
    governing = np.where(np.isfinite(plastic), whole(liquid) - whole(plastic), index)
    low = liquid < LEAST_LIQUID_LIMIT
    above = ~low & (governing > U_LINE_SLOPE * (liquid - U_LINE_ORIGIN))
    column, oven = _oven(samples)
    parts = [
        samples.findings_of(LOW_LIQUID_LIMIT, low, LIMITS[0]),
        samples.findings_of(ABOVE_U_LINE, above, *LIMITS),
        samples.findings_of(OVEN_ABOVE_LL, oven > liquid, column, LIMITS[0]),
    ]
    return intake.having(samples, *parts)


CHECKS = (nonplastic, impossible_limits, index_agrees, unusual_limits)
