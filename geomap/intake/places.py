"""Intake of places: where the borings lie on the alignment, and what their coordinates and levels tell.

Called once the borings have been located; see :func:`check`.
"""

from __future__ import annotations

import dataclasses

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.intake.entries import Entries, Flags, Intake, Texts
from geomap.intake.rows import left_out_together
from geomap.tables.findings import Check

FAR_HALF_WIDTHS = 10.0  # a hole this many half widths off is not a hole of this line in this system
LEAST_GROUP = 3  # fewer holes with a system of their own may well lie elsewhere
LEVEL_STEP_M = 5.0  # more than this above 0 on both sides, a ground level of 0 is no level; common practice, no source

LATITUDE = Check(
    "longitude and latitude as coordinates",
    "block",
    "easting and northing in the unit of the crs",
    "x and y look like degrees; give the crs of the borings (EPSG:4326 for most GPS sets) or convert them",
)
WRONG_SYSTEM = Check(
    "coordinates far from the line",
    "block",
    "borings along the alignment",
    "the crs is missing or wrong, or the zone is; state the crs of the borings and of the alignment",
)
SWAPPED = Check(
    "x and y may be swapped",
    "query",
    "easting in x, northing in y",
    "with x and y changed round the boring lies on the line; it is left out until they are",
)
NO_PLACE = Check("place of zero", "reject", "easting and northing", "the boring is left out; give its coordinates")
OFF_LINE = Check(
    "outside the corridor",
    "hold_out",
    "",
    "left out; if it belongs to the job, check its coordinates or widen half_width_m in the corridor file",
)
PAST_END = Check(
    "past the end of the line",
    "hold_out",
    "borings between the start and the end of the alignment",
    "left out; if it belongs to the job, lengthen the alignment or check its coordinates",
)
HAIRPIN = Check(
    "near two stretches of the line",
    "query",
    "a place square to one stretch",
    "placed on the nearer stretch; check that it was drilled for that one",
)
NO_LEVEL = Check(
    "no ground level",
    "query",
    "a level at each boring",
    "its neighbors have one; give the level, else that of the ground is used",
)
ZERO_LEVEL = Check(
    "ground level of zero",
    "reject",
    "a level above the vertical datum",
    "read as no level, since its neighbors lie well above 0; give the level",
)
MAYBE_ZERO_LEVEL = Check(
    "ground level of zero",
    "query",
    "a level above the vertical datum",
    "used as 0; clear the cell if it was not leveled",
)


def check(intake: Intake, placed: pd.DataFrame, half_width_m: float) -> Intake:
    """Judge the places of borings; leave out those that are not on the corridor, with their samples.

    Parameters
    ----------
    intake
        Tables after the intake of values.
    placed
        One row for each used boring, on the index of ``intake.used("borings")``:

        - ``distance_m``, ``offset_m``: along and square to the alignment, NaN where the boring cannot be placed;
        - ``ambiguous``, ``past_end``: near two stretches; beyond the start or the end;
        - ``away_m`` (if known): shortest distance to the line, in place of the offset for holes past the end;
        - ``geographic`` (if any are): the crs of the row is in degrees;
        - ``swapped_away_m`` (if known): shortest distance to the line with x and y changed round.
    half_width_m
        Half width of the corridor [m].

    Returns
    -------
    Intake
        Borings and what hangs on them with ``status`` and ``reason``. ``intake.blocks`` has rows where the
        coordinates of most borings cannot be right.
    """
    borings = intake["borings"]
    seat = _Seat.of(borings, placed, half_width_m)
    parts = _systems(borings, seat)
    for mask, rule, reason in _outside(seat):
        worded = dataclasses.replace(rule, allowed=rule.allowed or f"within {half_width_m:g} m of the alignment")
        fresh = mask & borings.used
        parts.append(borings.findings_of(worded, fresh, "x", "y", found=_with_distance(borings, seat)))
        borings = borings.leave_out(fresh, reason)
    near_two = seat.ambiguous & borings.used
    parts.append(borings.findings_of(HAIRPIN, near_two, "x", "y", found=_with_distance(borings, seat)))
    borings, level_parts = _ground_levels(borings, seat.distance)
    return left_out_together(intake.having(borings, *parts, *level_parts))


@dataclasses.dataclass(frozen=True)
class _Seat:
    """Arrays with one entry for each row of the borings table; NaN or false for rows left out before."""

    distance: NDArray[np.float64]
    away: NDArray[np.float64]
    swapped_away: NDArray[np.float64]
    ambiguous: Flags
    past_end: Flags
    degrees: Flags
    origin: Flags
    half_width: float

    @classmethod
    def of(cls, borings: Entries, placed: pd.DataFrame, half_width_m: float) -> _Seat:
        every = placed.reindex(borings.rows.index)

        def numbers(*names: str) -> NDArray[np.float64]:
            for name in names:
                if name in every.columns:
                    return every[name].to_numpy(dtype=float, na_value=np.nan)
            return np.full(len(every), np.nan)

        def flags(name: str) -> Flags:
            if name not in every.columns:
                return np.zeros(len(every), dtype=bool)
            return every[name].astype("boolean").fillna(False).to_numpy(dtype=bool)

        x, y = borings.numbers("x"), borings.numbers("y")
        away = np.abs(numbers("away_m", "offset_m"))
        outside = ~(away <= half_width_m)
        origin = (x == 0) & (y == 0) & outside
        small = (np.abs(x) <= 180) & (np.abs(y) <= 90) & ~flags("geographic")
        return cls(
            distance=numbers("distance_m"),
            away=away,
            swapped_away=np.abs(numbers("swapped_away_m")),
            ambiguous=flags("ambiguous"),
            past_end=flags("past_end"),
            degrees=small & (away > half_width_m) & ~origin,
            origin=origin,
            half_width=half_width_m,
        )

    @property
    def swaps(self) -> Flags:
        """True where changing x and y round brings a boring onto the line."""
        return ~(self.away <= self.half_width) & (self.swapped_away <= self.half_width)


def _systems(borings: Entries, seat: _Seat) -> list[pd.DataFrame]:
    """Block where most borings of one file and crs are far off the line."""
    groups = borings.rows[["file", "sheet", "crs"]].fillna("").assign(used=borings.used)
    number = groups.groupby(["file", "sheet", "crs"], sort=False).ngroup()
    far = ~(seat.away <= FAR_HALF_WIDTHS * seat.half_width)
    parts: list[pd.DataFrame] = []
    for group in number[borings.used].unique():
        member = (number == group).to_numpy(dtype=bool) & borings.used
        size = int(member.sum())
        if size < LEAST_GROUP and size < borings.used.sum():
            continue
        for mask, rule, words in (
            (seat.degrees, LATITUDE, "with x within 180 and y within 90"),
            (far & ~seat.degrees, WRONG_SYSTEM, f"more than {FAR_HALF_WIDTHS * seat.half_width:g} m from the line"),
        ):
            hit = member & mask
            if hit.sum() * 2 > size:
                swapped = rule is WRONG_SYSTEM and (hit & seat.swaps).sum() * 2 > size
                advice = "x and y look swapped; change them round" if swapped else rule.advice
                parts.append(
                    _block(borings, dataclasses.replace(rule, advice=advice), hit, f"{hit.sum()} of {size} {words}")
                )
    return parts


def _block(borings: Entries, rule: Check, hit: Flags, words: str) -> pd.DataFrame:
    """Return one finding about many rows, at the first of them."""
    first = np.zeros(len(hit), dtype=bool)
    first[np.flatnonzero(hit)[0]] = True
    example = borings.found("x", "y")[first][0]
    return borings.findings_of(
        rule, first, "x", "y", found=np.full(len(hit), f"{words} (first: {example})", dtype=object)
    )


def _outside(seat: _Seat) -> list[tuple[Flags, Check, object]]:
    """Return which borings are left out, by which check, and the reason beside each."""
    outside = ~(seat.away <= seat.half_width)
    far_words = pd.Series(seat.away).map("{:.0f} m from the alignment".format).to_numpy(object)
    reasons = np.where(np.isfinite(seat.away), far_words, "cannot be placed on the alignment")
    degrees = dataclasses.replace(LATITUDE, action="reject", advice=LATITUDE.advice + "; the boring is left out")
    return [
        (seat.origin, NO_PLACE, "no coordinates"),
        (seat.degrees, degrees, "coordinates look like degrees"),
        (seat.swaps, SWAPPED, "x and y may be swapped"),
        (seat.past_end, PAST_END, "past the end of the alignment"),
        (outside, OFF_LINE, reasons),
    ]


def _with_distance(borings: Entries, seat: _Seat) -> Texts:
    words = (
        pd.Series(seat.away).map("; {:.0f} m from the line".format).where(np.isfinite(seat.away), "; not on the line")
    )
    return np.asarray(borings.found("x", "y") + words.to_numpy(object), dtype=object)


def _ground_levels(borings: Entries, distance: NDArray[np.float64]) -> tuple[Entries, list[pd.DataFrame]]:
    """Ask about ground levels that are missing or 0 between borings that lie above 0."""
    level = borings.numbers("ground_level_m")
    known = pd.DataFrame({"level": np.where(level == 0, np.nan, level), "distance": distance})
    order = known.loc[borings.used & np.isfinite(distance)].sort_values("distance").index
    before = known["level"].loc[order].ffill().reindex(known.index).to_numpy()
    after = known["level"].loc[order].bfill().reindex(known.index).to_numpy()
    lowest = np.fmin(before, after)
    zero = borings.used & (level == 0)
    missing = borings.used & np.isnan(level) & (lowest > 0)
    wrong, unsure = zero & (lowest > LEVEL_STEP_M), zero & (lowest > 0) & ~(lowest > LEVEL_STEP_M)
    parts = [
        borings.findings_of(NO_LEVEL, missing, "ground_level_m"),
        borings.findings_of(ZERO_LEVEL, wrong, "ground_level_m"),
        borings.findings_of(MAYBE_ZERO_LEVEL, unsure, "ground_level_m"),
    ]
    return borings.set_aside(wrong, "ground_level_m"), parts
