"""ASTM D2487: the decision rules as sets of symbols that stay possible.

Every test narrows a set: the band of fines, gravel or sand with its grading term, the zone of the plasticity
chart, organic or not. The symbols left are the combinations of what is left, one bit for each symbol. One bit: the
symbol. More: the data do not decide. None: the data contradict each other. Missing data just narrow nothing.

References
----------
ASTM D2487-17, Table 1, Figs. 1 to 4. What was not confirmed against a published excerpt is marked from memory.
"""

from __future__ import annotations

import functools
from dataclasses import dataclass, fields
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

from geomap.soils import plasticity
from geomap.soils.plasticity import NOISE, Zones
from geomap.soils.records import Arrays, Flags, Floats, Reading, blocks, taken, whole

# In the order of Figs. 3, 1a, 1b and 2. Older texts write GM-GC and SM-SC for GC-GM and SC-SM.
SYMBOLS = (
    *("GW", "GW-GM", "GW-GC", "GP", "GP-GM", "GP-GC", "GM", "GC", "GC-GM"),
    *("SW", "SW-SM", "SW-SC", "SP", "SP-SM", "SP-SC", "SM", "SC", "SC-SM"),
    *("CL", "CL-ML", "ML", "CH", "MH", "OL", "OH", "PT"),
)

FINE_GRAINED = 50.0  # Table 1: 50 % or more passes No. 200
DUAL_FROM, DUAL_TO = 5.0, 12.0  # Table 1 notes C and D: 5 to 12 % fines, both ends included
GRAVEL_LEAST_CU, SAND_LEAST_CU = 4.0, 6.0  # Table 1
LEAST_CC, GREATEST_CC = 1.0, 3.0  # Table 1
HATCHED_FROM_PI, HATCHED_TO_PI = 4.0, 7.0  # Fig. 4: both ends are CL-ML
HIGH_PLASTICITY = 50.0  # Table 1: liquid limit 50 or more is H
LEAST_CU = 1.0  # D60 is never less than D10

# Bands of fines.
CLEAN, DUAL, DIRTY, FINE, NO_FINES_TEST, CONTRADICTORY = range(6)
# Gravel or sand, with the grading term: one bit each.
GRADED = {"GW": 1, "GP": 2, "SW": 4, "SP": 8}
GRAVEL, SAND = GRADED["GW"] | GRADED["GP"], GRADED["SW"] | GRADED["SP"]
# Zones of the plasticity chart: one bit each.
ZONES = {"ML": 1, "CL-ML": 2, "CL": 4, "MH": 8, "CH": 16}
SILT_ZONES = ZONES["ML"] | ZONES["MH"]
CLAY_ZONES = ZONES["CL-ML"] | ZONES["CL"] | ZONES["CH"]
INORGANIC, ORGANIC = 1, 2

BY_EYE = np.array([SILT_ZONES | CLAY_ZONES, SILT_ZONES, CLAY_ZONES], dtype=np.uint16)  # of fines_by_eye

Small: TypeAlias = NDArray[np.uint8]
Masks: TypeAlias = NDArray[np.uint32]


@dataclass(frozen=True)
class Sets:
    """What the tests leave possible for each record.

    Attributes
    ----------
    band
        CLEAN, DUAL, DIRTY (coarse, over 12 % fines), FINE, NO_FINES_TEST or CONTRADICTORY.
    grading, zones, organic
        Bits of GRADED, of ZONES, and of INORGANIC and ORGANIC.
    is_by_eye
        The fines were called silty or clayey from the visual estimate.
    p4_low, p4_high, p200
        Percent passing No. 4 (its bounds, equal where it was measured) and No. 200, as read.
    """

    band: Small
    grading: Small
    zones: Zones
    organic: Small
    is_by_eye: Flags
    p4_low: NDArray[np.float32]
    p4_high: NDArray[np.float32]
    p200: NDArray[np.float32]

    @property
    def place(self) -> NDArray[np.uint16]:
        """The place of each record in the tables of `tables`."""
        band, grading = self.band.astype(np.uint16), self.grading.astype(np.uint16)
        return np.asarray((band << 11) | (grading << 7) | (self.zones << 2) | self.organic)


@functools.cache
def tables() -> tuple[Masks, NDArray[np.int8]]:
    """Return, for each combination of sets, the symbols left (bits) and the code of the only one left (or 0)."""
    mask = np.zeros((8, 16, 32, 4), dtype=np.uint32)

    def allow(band: int, symbol: str, grading: int, zones: int, organic: int) -> None:
        held = [
            np.flatnonzero((np.arange(size) & bits) > 0) if bits else np.arange(size)
            for size, bits in ((16, grading), (32, zones), (4, organic))
        ]
        mask[band][np.ix_(*held)] |= np.uint32(1 << SYMBOLS.index(symbol))

    for graded, bit in GRADED.items():
        allow(CLEAN, graded, bit, 0, 0)
        allow(DUAL, f"{graded}-{graded[0]}M", bit, SILT_ZONES, 0)
        allow(DUAL, f"{graded}-{graded[0]}C", bit, CLAY_ZONES, 0)  # CL-ML too: from memory, text and Fig. 3
    for letter, side in (("G", GRAVEL), ("S", SAND)):
        allow(DIRTY, f"{letter}M", side, SILT_ZONES, 0)
        allow(DIRTY, f"{letter}C", side, ZONES["CL"] | ZONES["CH"], 0)
        allow(DIRTY, f"{letter}C-{letter}M", side, ZONES["CL-ML"], 0)  # note G, from memory
    for zone, bit in ZONES.items():
        allow(FINE, zone, 0, bit, INORGANIC)
        allow(FINE, "OH" if zone.endswith("H") else "OL", 0, bit, ORGANIC)
    masks = mask.ravel()
    single = (masks > 0) & ((masks & (masks - np.uint32(1))) == 0)
    return masks, np.where(single, np.log2(np.maximum(masks, 1)) + 1, 0).astype(np.int8)


def chart_zones(ll: Floats, pi: Floats) -> Zones:
    """Return the zone of the plasticity chart, one bit of ZONES, for known liquid limit and index (Fig. 4)."""
    is_above = plasticity.is_above_a_line(ll, pi)
    low = (is_above & (pi >= HATCHED_FROM_PI)).view(np.int8) + (is_above & (pi > HATCHED_TO_PI)).view(np.int8)
    zone = np.where(ll >= HIGH_PLASTICITY, is_above.view(np.int8) + np.int8(3), low)
    return np.array(list(ZONES.values()), dtype=np.uint16)[zone]


def sets(columns: Arrays, reading: Reading = whole) -> Sets:
    """Return what the tests of a block of records leave possible.

    Parameters
    ----------
    columns
        The columns of ``NEEDS`` as arrays.
    reading
        `whole`: percentages and limits in whole numbers, as classified; `as_given`: unrounded.
    """
    p200 = reading(columns["passing_0_075_mm_pct"])
    low, high = _no_4(columns, p200, reading)
    band = (p200 >= DUAL_FROM).astype(np.uint8)
    band += p200 > DUAL_TO
    band += p200 >= FINE_GRAINED
    band[np.isnan(p200)] = NO_FINES_TEST
    band[high < p200] = CONTRADICTORY
    ll, pl, pi = plasticity.limits(columns, reading)
    zones = plasticity.possible_zones(ll, pl, pi, chart_zones)
    is_by_eye = (band == DUAL) & (columns["fines_by_eye"] > 0) & is_open(zones)
    if is_by_eye.any():
        zones[is_by_eye] &= BY_EYE[columns["fines_by_eye"][is_by_eye]]
    return Sets(
        band=band,
        grading=_grading(columns, band, low, high, p200),
        zones=zones,
        organic=_organic(ll, reading(columns["liquid_limit_oven_dried_pct"])),
        is_by_eye=is_by_eye,
        p4_low=low.astype(np.float32),
        p4_high=high.astype(np.float32),
        p200=p200.astype(np.float32),
    )


def sets_of_all(columns: Arrays) -> Sets:
    """Return `sets` of any number of records, block by block."""
    rows = len(columns["passing_0_075_mm_pct"])
    parts = [sets(taken(columns, block)) for block in blocks(rows)] or [sets(columns)]
    return Sets(**{f.name: np.concatenate([getattr(part, f.name) for part in parts]) for f in fields(Sets)})


def _no_4(columns: Arrays, p200: Floats, reading: Reading) -> tuple[Floats, Floats]:
    """Return bounds on percent passing No. 4: a finer sieve never passes more than it."""
    p4 = reading(columns["passing_4_75_mm_pct"])
    is_open = np.isnan(p4)
    if not is_open.any():
        return p4, p4
    finer = np.fmax(reading(columns["passing_2_mm_pct"]), reading(columns["passing_0_425_mm_pct"]))
    return np.where(is_open, np.fmax(finer, p200), p4), np.where(is_open, 100.0, p4)


def is_open(zones: Zones) -> Flags:
    """Return whether both silty and clayey fines stay possible."""
    return np.asarray(((zones & SILT_ZONES) > 0) & ((zones & CLAY_ZONES) > 0))


def _grading(columns: Arrays, band: Small, low: Floats, high: Floats, p200: Floats) -> Small:
    """Return gravel or sand (more than half of the coarse part on No. 4 is gravel), with the grading term."""
    coarse = 100.0 - p200
    is_gravel = 2.0 * (100.0 - low) > coarse + NOISE
    is_sand = 2.0 * (100.0 - high) <= coarse + NOISE
    gravel = np.full(len(band), GRAVEL, dtype=np.uint8)
    sand = np.full(len(band), SAND, dtype=np.uint8)
    rows = np.flatnonzero(band <= DUAL)
    if len(rows):
        shape = taken({name: columns[name] for name in SHAPE}, rows)
        gravel[rows] = terms(shape, GRAVEL_LEAST_CU)
        sand[rows] = terms(shape, SAND_LEAST_CU) << 2
    return np.asarray(gravel * is_gravel | sand * is_sand)


SHAPE = ("cu_low", "cu_high", "cc_low", "cc_high", "tie_low", "tie_high")


def terms(shape: Arrays, least_cu: float) -> Small:
    """Return which grading terms stay possible, as bits: 1 well graded, 2 poorly graded.

    Parameters
    ----------
    shape
        The columns of `SHAPE`: bounds on Cu, on Cc and on ``(D60 / D30)^2``; NaN where there is none.
    least_cu
        4 for gravel, 6 for sand.

    Notes
    -----
    Where Cu is not known but D30 and D60 are, Cu and Cc are tied: ``Cu = Cc (D60 / D30)^2``, so a curve that is
    steep between D30 and D60 can be shown to fail one or the other whatever D10 is.
    """
    cu_low, cu_high = np.fmax(shape["cu_low"], LEAST_CU), np.fmin(shape["cu_high"], np.inf)
    cc_low, cc_high = np.fmax(shape["cc_low"], 0.0), np.fmin(shape["cc_high"], np.inf)
    well = (cu_high >= least_cu) & (cc_high >= LEAST_CC) & (cc_low <= GREATEST_CC)
    poorly = (cu_low < least_cu) | (cc_low < LEAST_CC) | (cc_high > GREATEST_CC)
    tied = np.flatnonzero((cu_low != cu_high) & ~np.isnan(shape["tie_low"] + shape["tie_high"]))
    if len(tied):
        tie_low, tie_high = shape["tie_low"][tied], shape["tie_high"][tied]
        low = np.maximum(cu_low[tied], cc_low[tied] * tie_low)
        high = np.minimum(cu_high[tied], cc_high[tied] * tie_high)
        is_allowed = np.maximum(low, least_cu) <= np.minimum(high, GREATEST_CC * tie_high)
        well[tied] &= is_allowed & (high >= LEAST_CC * tie_low)
        poorly[tied] &= (low < np.maximum(least_cu, LEAST_CC * tie_high)) | (high > GREATEST_CC * tie_low)
    return np.asarray(well + np.uint8(2) * poorly, dtype=np.uint8)


def _organic(ll: Floats, oven_dried: Floats) -> Small:
    """Return organic or not; without the test inorganic, and open where the limit before drying is missing."""
    result = np.full(len(ll), INORGANIC, dtype=np.uint8)
    rows = np.flatnonzero(~np.isnan(oven_dried))
    if len(rows):
        result[rows] = np.where(plasticity.is_organic(ll[rows], oven_dried[rows]), ORGANIC, INORGANIC)
        result[rows[np.isnan(ll[rows])]] = INORGANIC | ORGANIC
    return result


def possible_without_fines(columns: Arrays) -> Masks:
    """Return the symbols left where percent passing No. 200 is missing: every band that it could lie in.

    The finer sieves bound it from above, so a band may be ruled out; no symbol is decided this way, for a class
    without a fines test is not allowed.
    """
    rows = len(columns["passing_0_075_mm_pct"])
    sieves = ("passing_4_75_mm_pct", "passing_2_mm_pct", "passing_0_425_mm_pct")
    most = np.fmin.reduce([whole(columns[name]) for name in sieves] + [np.full(rows, 100.0)])
    masks, _ = tables()
    possible = np.zeros(rows, dtype=np.uint32)
    for lowest, highest in ((0.0, DUAL_FROM - 1), (DUAL_FROM, DUAL_TO), (DUAL_TO + 1, 49.0), (FINE_GRAINED, 100.0)):
        for fines in (np.full(rows, lowest), np.minimum(highest, most)):
            tried = masks[sets({**columns, "passing_0_075_mm_pct": fines}).place]
            possible |= np.where(most >= lowest, tried, np.uint32(0))
    return possible
