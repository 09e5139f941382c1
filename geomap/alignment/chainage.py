"""Chainage: the label on the peg, and how it goes with distance along the line.

Chainage grows with distance except at a *chainage equation*, where the value reached from behind (``back``) goes on
as another (``ahead``). Where ahead is larger, the values between are missing (a gap); where it is smaller, those
between occur twice (an overlap). At the equation itself both labels name the same place, and the ahead one is written.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import NamedTuple

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

from geomap.alignment import labels
from geomap.errors import UsageError, problem
from geomap.units import factor_from_spelling

Floats = NDArray[np.float64]

TOLERANCE_M = 0.0005  # a chainage so little outside a stretch is its end; two distances so close are one


class Located(NamedTuple):
    """Where chainages lie, shape (n,) each.

    Attributes
    ----------
    distance_m
        Distance along the line [m]; the first one where there are several; missing where there is none. Before
        the start it is negative, beyond the end larger than the length.
    second_distance_m
        The next place with the same chainage; missing where there is one place only.
    is_ambiguous
        Whether there are several.
    reason
        Blank, or why the distance is missing or not sure.
    """

    distance_m: Floats
    second_distance_m: Floats
    is_ambiguous: NDArray[np.bool_]
    reason: NDArray[np.object_]


@dataclass(frozen=True)
class Equation:
    """One chainage equation, both values in meters."""

    back_m: float
    ahead_m: float


@dataclass(frozen=True)
class Chainage:
    """The chainage of one line. Settings in the unit of the labels: :func:`chainage_from_settings`.

    Attributes
    ----------
    start_m
        Chainage at the start of the line [m].
    equations
        In the order of the line.
    format
        ``0+000`` or ``0+00``.
    unit_m
        Meters in one unit of the labels.

    Raises
    ------
    UsageError
        The format is unknown, or an equation cannot be: its back value is not reached after the value before it.

    Examples
    --------
    >>> chainage = Chainage(1000.0, (Equation(1200.0, 1250.0),))
    >>> chainage.label_from_distance([0.0, 199.5, 200.0, 300.25]).tolist()
    ['1+000', '1+199.5', '1+250', '1+350.25']
    >>> chainage.distance_from_label(["1+200", "1+250", "1+225"]).distance_m.tolist()
    [200.0, 200.0, nan]
    >>> chainage.breaks
    ((0.0, 1000.0), (200.0, 1250.0))
    """

    start_m: float = 0.0
    equations: tuple[Equation, ...] = ()
    format: str = "0+000"
    unit_m: float = 1.0

    def __post_init__(self) -> None:
        if self.format not in labels.FORMATS:
            raise UsageError(problem("chainage format", self.format, ", ".join(labels.FORMATS), "choose one of these"))
        values = [self.start_m, self.unit_m, *(v for e in self.equations for v in (e.back_m, e.ahead_m))]
        if not np.isfinite(values).all() or self.unit_m <= 0:
            raise UsageError(problem("chainage", values, "numbers", "give every value"))
        reached = self.start_m
        for number, equation in enumerate(self.equations, start=1):
            if equation.back_m <= reached + TOLERANCE_M:
                raise UsageError(
                    problem(
                        f"chainage equation {number}, back",
                        self._label(equation.back_m),
                        f"more than {self._label(reached)}, from which the line goes on there",
                        "list equations in the order of the line: back is the value reached, ahead the next one",
                    )
                )
            reached = equation.ahead_m

    @cached_property
    def breaks(self) -> tuple[tuple[float, float], ...]:
        """Pairs of distance and chainage [m]: the start, then the ahead side of each equation."""
        pairs = [(0.0, self.start_m)]
        for equation in self.equations:
            at, value = pairs[-1]
            pairs.append((at + equation.back_m - value, equation.ahead_m))
        return tuple((float(at), float(value)) for at, value in pairs)

    def chainage_from_distance(self, distance_m: ArrayLike) -> Floats:
        """Return chainage values [m] of distances [m], any shape; the ahead value at an equation."""
        at = np.asarray(distance_m, dtype=float)
        starts, values = (np.array(column) for column in zip(*self.breaks, strict=True))
        stretch = np.clip(np.searchsorted(starts, at, side="right") - 1, 0, None)
        result: Floats = values[stretch] + (at - starts[stretch])
        return result

    def distance_from_chainage(self, chainage_m: ArrayLike) -> Located:
        """Return where chainage values [m] lie, shape (n,).

        Values below the start lie before the line unless an overlap brings them back; values beyond the last one
        lie beyond the line.
        """
        values = np.atleast_1d(np.asarray(chainage_m, dtype=float))
        candidates = np.full((len(self.breaks), len(values)), np.nan)
        ends = [equation.back_m for equation in self.equations] + [np.inf]
        for row, ((at, first), last) in enumerate(zip(self.breaks, ends, strict=True)):
            here = (values >= first - TOLERANCE_M) & (values <= last + TOLERANCE_M)
            candidates[row, here] = at + np.clip(values[here], first, last) - first
            if row:  # the two sides of one equation are one place
                same = here & (np.abs(candidates[row] - candidates[:row]) <= TOLERANCE_M).any(axis=0)
                candidates[row, same] = np.nan
        before = np.isnan(candidates).all(axis=0) & (values < self.start_m)
        candidates[0, before] = values[before] - self.start_m
        candidates = np.sort(candidates, axis=0)  # missing last
        second = candidates[1] if len(candidates) > 1 else np.full(len(values), np.nan)
        return Located(candidates[0], second, np.isfinite(second), self._reasons(values, candidates))

    def distance_from_label(self, texts: object) -> Located:
        """Return where chainages given as text lie.

        Parameters
        ----------
        texts
            One text, or a list or series of texts; how they are read: `geomap.alignment.labels`.
        """
        values, reasons = labels.read(labels.as_texts(texts), self.format, self.unit_m)
        located = self.distance_from_chainage(values)
        unread = np.array([bool(reason) for reason in reasons], dtype=bool)
        return located._replace(reason=np.where(unread, np.array(reasons, dtype=object), located.reason))

    def label_from_distance(self, distance_m: ArrayLike, decimals: int = 3) -> pd.Series[str]:
        """Return labels of distances [m], shape (n,), as a series of texts; missing in, missing out."""
        return self.label_from_chainage(self.chainage_from_distance(np.atleast_1d(np.asarray(distance_m))), decimals)

    def label_from_chainage(self, chainage_m: ArrayLike, decimals: int = 3) -> pd.Series[str]:
        """Return labels of chainage values [m], shape (n,), as a series of texts; missing in, missing out."""
        return pd.Series(labels.written(chainage_m, self.format, self.unit_m, decimals), dtype="string")

    def _label(self, value_m: float) -> str:
        return labels.written([value_m], self.format, self.unit_m)[0] or ""

    def _reasons(self, values: Floats, candidates: Floats) -> NDArray[np.object_]:
        reason = np.full(len(values), "", dtype=object)
        count = np.isfinite(candidates).sum(axis=0)
        for row in np.flatnonzero(count > 1):
            places = " and ".join(f"{at:.3f}" for at in candidates[: count[row], row])
            reason[row] = f"this chainage occurs {count[row]} times: at distances {places} m; give distance_m"
        for row in np.flatnonzero((count == 0) & np.isfinite(values)):
            gap = next(e for e in self.equations if e.back_m < values[row] < e.ahead_m)
            ahead, back = self._label(gap.ahead_m), self._label(gap.back_m)
            reason[row] = f"this chainage does not occur: the line goes from {back} to {ahead} in one place"
        return reason


def chainage_from_settings(
    start: float | str = 0.0,
    equations: Iterable[tuple[float | str, float | str]] = (),
    form: str = "0+000",
    length_unit: str = "m",
    length_m: float | None = None,
    place: str = "corridor.toml: alignment",
) -> Chainage:
    """Return the chainage that a corridor file describes.

    Parameters
    ----------
    start
        Chainage at the start: a number in the unit of the labels (meters, or feet with ``0+00``), or a label.
    equations
        Pairs of back and ahead, each a number or a label, in the order of the line.
    form
        ``0+000`` (meters by the kilometer) or ``0+00`` (feet by the hundred).
    length_unit
        ``us-ft`` makes the feet of ``0+00`` US survey feet; they are international feet otherwise.
    length_m
        Length of the line [m], to refuse equations beyond its end; None where it is not known yet.
    place
        Where it was written, for messages.

    Raises
    ------
    UsageError
        A value cannot be read, or an equation cannot be.

    Examples
    --------
    >>> chainage_from_settings("10+00", [("12+00", 1250.0)], "0+00").label_from_distance([60.0, 61.0]).tolist()
    ['11+96.85', '12+50.131']
    """
    if form not in labels.FORMATS:
        raise UsageError(problem(f"{place}, format", form, ", ".join(labels.FORMATS), "choose one of these"))
    foot = factor_from_spelling("m", "us-ft" if length_unit == "us-ft" else "ft")
    unit = foot if form == "0+00" and foot is not None else 1.0
    pairs = [tuple(pair) for pair in equations]
    try:
        chainage = Chainage(
            _value(start, form, unit, f"{place}, start_chainage"),
            tuple(_equation(pair, form, unit, f"{place}, equation {n}") for n, pair in enumerate(pairs, start=1)),
            form,
            unit,
        )
    except UsageError as error:
        text = str(error)
        raise UsageError(text if text.startswith(place) else f"{place}: {text}") from None
    beyond = [n for n, (at, _) in enumerate(chainage.breaks) if n and length_m is not None and at > length_m]
    if beyond:
        raise UsageError(
            problem(
                f"{place}, equation {beyond[0]}",
                f"{chainage.breaks[beyond[0]][0]:.3f} m from the start",
                f"on the line, which is {length_m:.3f} m long",
                "correct the equation or the start chainage, or check the alignment file",
            )
        )
    return chainage


def _equation(pair: Sequence[float | str], form: str, unit_m: float, place: str) -> Equation:
    back, ahead = pair
    return Equation(_value(back, form, unit_m, f"{place}, back"), _value(ahead, form, unit_m, f"{place}, ahead"))


def _value(given: float | str, form: str, unit_m: float, place: str) -> float:
    if not isinstance(given, str):
        return float(given) * unit_m
    values, reasons = labels.read([given], form, unit_m)
    if reasons[0]:
        raise UsageError(problem(place, given, f"a number or a chainage as {form}", reasons[0]))
    return float(values[0])
