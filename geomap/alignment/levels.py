"""Levels along the line: tables of them, ground from collar levels, and formation from what the drawings state."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field, replace
from types import MappingProxyType

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

from geomap.alignment.chainage import TOLERANCE_M, Chainage
from geomap.errors import UsageError, problem
from geomap.tables.findings import Check, together

Floats = NDArray[np.float64]
Flags = NDArray[np.bool_]

DISAGREEMENT_M = 0.05  # between distance_m and chainage of one row; common practice, no source
LEVEL_AGREEMENT_M = 0.001  # two levels so close, at one place, are one level

NO_PLACE = Check("levels: place", "reject", "distance_m or a chainage", "the row is not used; correct its place")
TWO_PLACES = Check("levels: chainage occurs twice", "hold_out", "a chainage that occurs once", "give distance_m too")
DISAGREES = Check(
    "levels: distance and chainage disagree", "query", f"within {DISAGREEMENT_M} m", "distance_m was used; check both"
)
NO_LEVEL = Check("levels: no level", "reject", "a level", "the row is not used; fill the level in")
REPEATED = Check(
    "levels: place given twice", "hold_out", "one level at each place", "the first was used; keep the right one"
)
UNSORTED = Check("levels: order", "query", "rows in the order of the line", "rows were sorted; check their places")
NONE_USED = Check("levels: none used", "block", "at least one place with its level", "correct the rows named here")


@dataclass(frozen=True, eq=False)
class LevelTable:
    """Levels at places along the line, straight between them.

    Attributes
    ----------
    distance, level
        [m], shape (places,), distance growing.
    width
        Width of the formation there [m], missing where not given.
    basis
        Where the levels come from, in words.
    holds_beyond
        Whether the first and last level hold beyond the places; if not, they are missing there.
    """

    distance: Floats
    level: Floats
    width: Floats
    basis: str
    holds_beyond: bool = False

    def level_at(self, distance_m: ArrayLike) -> Floats:
        """Return levels at distances [m], any shape: straight between places, missing beyond them (or held)."""
        return _between(distance_m, self.distance, self.level, self.holds_beyond)

    def width_at(self, distance_m: ArrayLike, default_m: float) -> Floats:
        """Return widths at distances [m], any shape: straight between places that have one.

        The first and last hold beyond their places; `default_m` serves where no width is given at all.
        """
        known = np.isfinite(self.width)
        if not known.any():
            return np.full(np.shape(distance_m), float(default_m))
        return _between(distance_m, self.distance[known], self.width[known], holds_beyond=True)


def levels_from_table(table: pd.DataFrame, chainage: Chainage, what: str = "levels") -> tuple[LevelTable, pd.DataFrame]:
    """Return levels along the line from a table of them, and the findings about its rows.

    Parameters
    ----------
    table
        Columns of the layout ``levels`` (``distance_m``, ``chainage``, ``level_m``, ``width_m``), and ``file``,
        ``sheet``, ``row_number``. Where a row has distance and chainage, the distance is used.
    chainage
        Of the line, to read chainages.
    what
        What the levels are, for the basis.

    Returns
    -------
    LevelTable
        Sorted; empty, with a finding that blocks, if no row can be used.
    DataFrame
        Findings in the layout of `geomap.tables.findings`: places that cannot be read, do not occur or occur twice;
        distance and chainage that disagree; missing levels; one place with two levels; rows out of order.
    """
    given = _column(table, "distance_m")
    texts = table["chainage"] if "chainage" in table else pd.Series(pd.NA, table.index, dtype="string")
    located = chainage.distance_from_label(texts)
    level, width = _column(table, "level_m"), _column(table, "width_m")
    by_text = np.isnan(given)
    has_text = texts.notna().to_numpy(dtype=bool)
    distance = np.where(by_text, located.distance_m, given)
    off = _disagreement(given, located.distance_m, located.second_distance_m)
    twice = by_text & located.is_ambiguous
    nowhere = by_text & np.isnan(located.distance_m)
    no_level = ~nowhere & ~twice & np.isnan(level)
    usable = ~(nowhere | twice | no_level)
    repeated, same, unsorted = _order(distance, level, usable)
    label = np.where(has_text, texts.astype(object).to_numpy(), "no place")
    parts = [
        NO_PLACE.rows(table, nowhere & ~has_text, "chainage", "no place"),
        _by_reason(NO_PLACE, table, nowhere & has_text, label, located.reason),
        _by_reason(TWO_PLACES, table, twice, label, located.reason),
        DISAGREES.rows(table, off > DISAGREEMENT_M, "distance_m, chainage", _pairs(given, label, off)),
        NO_LEVEL.rows(table, no_level, "level_m", ""),
        REPEATED.rows(table, repeated, "level_m", _numbers(level)),
        UNSORTED.rows(table, unsorted, "distance_m", _numbers(distance)),
    ]
    used = np.flatnonzero(usable & ~repeated & ~same)
    if not len(used):
        name = str(table["file"].iloc[0]) if len(table) and "file" in table else pd.NA
        parts.append(NONE_USED.row("level_m", f"{len(table)} rows, none of use", file=name))
    used = used[np.argsort(distance[used], kind="stable")]
    basis = f"{what} from a table of {len(used)} places, straight between them"
    return LevelTable(distance[used], level[used], width[used], basis), together(parts)


def ground_from_collars(distance_m: ArrayLike, ground_level_m: ArrayLike) -> LevelTable:
    """Return the ground along the line from the collar levels of borings, for want of a survey.

    Straight between borings by distance, the mean where several share a place, constant beyond the first and last;
    `LevelTable.basis` says so. Offsets are not looked at: on side-long ground give a table.

    Parameters
    ----------
    distance_m, ground_level_m
        Shape (borings,); those with a missing value are left out.

    Examples
    --------
    >>> ground = ground_from_collars([100.0, 0.0, 0.0, 50.0], [12.0, 9.0, 11.0, np.nan])
    >>> ground.level_at([-10.0, 0.0, 50.0, 200.0]).tolist()
    [10.0, 10.0, 11.0, 12.0]
    >>> ground.basis
    'ground from collar levels of 3 borings: straight between them, constant beyond the first and last'
    """
    at, level = np.asarray(distance_m, dtype=float), np.asarray(ground_level_m, dtype=float)
    known = np.isfinite(at) & np.isfinite(level)
    order = np.flatnonzero(known)[np.argsort(at[known], kind="stable")]
    at, level = at[order], level[order]
    place = np.cumsum(np.diff(at, prepend=at[:1]) > TOLERANCE_M) if len(at) else np.zeros(0, dtype=int)
    share = np.bincount(place)
    basis = (
        f"ground from collar levels of {len(at)} borings: straight between them, constant beyond the first and last"
        if len(at)
        else "ground not known: no boring has a level"
    )
    mean_at, mean_level = np.bincount(place, at) / share, np.bincount(place, level) / share
    return LevelTable(mean_at, mean_level, np.full(len(share), np.nan), basis, holds_beyond=True)


@dataclass(frozen=True)
class _Given:
    """What a formation level is worked out from."""

    level: Floats
    ground: Floats
    thickness_m: float
    diameter_m: float = field(default=np.nan)


# Formation is the top of subgrade of a road and the trench bottom of a pipeline. Thickness is what lies on it: the
# construction of a road, the bedding (and pipe wall, under an invert) of a pipe, the topsoil strip of a ground.
_FORMATIONS: Mapping[str, Callable[[_Given], Floats]] = MappingProxyType(
    {
        "formation": lambda given: given.level,
        "finished_level": lambda given: given.level - given.thickness_m,
        "invert": lambda given: given.level - given.thickness_m,
        "crown": lambda given: given.level - given.diameter_m - given.thickness_m,
        "cover": lambda given: given.ground - given.level - given.diameter_m - given.thickness_m,
        "ground": lambda given: given.ground - given.thickness_m,
    }
)
REFERENCES = tuple(_FORMATIONS)
NEEDS_DIAMETER = ("crown", "cover")


def formation_level(
    level_m: ArrayLike,
    reference: str,
    construction_thickness_m: float = 0.0,
    pipe_diameter_m: float | None = None,
    ground_level_m: ArrayLike = np.nan,
    place: str = "corridor.toml: formation",
) -> Floats:
    """Return the formation level from the level that the drawings state.

    ==================  =========================================================
    reference           formation level
    ==================  =========================================================
    ``formation``       as given
    ``finished_level``  given - thickness of the construction
    ``invert``          given - thickness of bedding (and pipe wall)
    ``crown``           given (top of pipe) - outside diameter - bedding
    ``cover``           ground - given (cover over the pipe) - outside diameter - bedding
    ``ground``          ground - thickness of the strip; the given level is not looked at
    ==================  =========================================================

    Parameters
    ----------
    level_m
        What the table gives, any shape [m]; for ``cover`` a depth and not a level.
    reference
        One of :data:`REFERENCES`.
    construction_thickness_m
        What lies between the reference and formation [m].
    pipe_diameter_m
        Outside diameter [m]; needed for ``crown`` and ``cover``.
    ground_level_m
        Of a shape that fits [m]; needed for ``cover`` and ``ground``. Missing in, missing out.
    place
        Where the settings were written, for the message.

    Raises
    ------
    UsageError
        The reference is unknown, a thickness or diameter is negative, or a diameter is missing.

    Examples
    --------
    >>> formation_level([10.0, 11.0], "finished_level", construction_thickness_m=0.5).tolist()
    [9.5, 10.5]
    >>> round(float(formation_level(1.2, "cover", 0.15, pipe_diameter_m=0.6, ground_level_m=20.0)), 3)
    18.05
    """
    if reference not in _FORMATIONS:
        raise UsageError(problem(f"{place}, reference", reference, ", ".join(REFERENCES), "choose one of these"))
    if reference in NEEDS_DIAMETER and not (pipe_diameter_m is not None and pipe_diameter_m > 0):
        found = "no pipe_diameter_m" if pipe_diameter_m is None else pipe_diameter_m
        allowed = f"with reference {reference}, the outside diameter of the pipe [m]"
        raise UsageError(problem(f"{place}, pipe_diameter_m", found, allowed, "give it, or state levels of the invert"))
    if not construction_thickness_m >= 0:
        raise UsageError(
            problem(f"{place}, construction_thickness_m", construction_thickness_m, "0 or more", "correct it")
        )
    level, ground = (np.asarray(a, dtype=float) for a in np.broadcast_arrays(level_m, ground_level_m))
    given = _Given(level, ground, construction_thickness_m)
    if pipe_diameter_m is not None:
        given = replace(given, diameter_m=pipe_diameter_m)
    return _FORMATIONS[reference](given) + 0.0


def _between(distance_m: ArrayLike, places: Floats, values: Floats, holds_beyond: bool) -> Floats:
    at = np.asarray(distance_m, dtype=float)
    if not len(places):
        return np.full(at.shape, np.nan)
    inside = (at >= places[0] - TOLERANCE_M) & (at <= places[-1] + TOLERANCE_M)
    result: Floats = np.where(inside | holds_beyond, np.interp(at, places, values), np.nan)
    return result


def _column(table: pd.DataFrame, name: str) -> Floats:
    if name not in table:
        return np.full(len(table), np.nan)
    return table[name].to_numpy(dtype=float, na_value=np.nan)


def _disagreement(given: Floats, first: Floats, second: Floats) -> Floats:
    """Return how far a distance is from the nearer place of its chainage, 0 where there is nothing to compare."""
    off = np.abs(given - first)
    return np.nan_to_num(np.fmin(off, np.abs(given - second)))


def _order(distance: Floats, level: Floats, usable: Flags) -> tuple[Flags, Flags, Flags]:
    """Return which rows repeat a place with another level, which with the same, and which come before their turn."""
    repeated, same, unsorted = (np.zeros(len(distance), dtype=bool) for _ in range(3))
    rows = np.flatnonzero(usable)
    ordered = rows[np.argsort(distance[rows], kind="stable")]
    starts = np.diff(distance[ordered], prepend=-np.inf) > TOLERANCE_M
    first = ordered[np.maximum.accumulate(np.where(starts, np.arange(len(ordered)), 0))] if len(ordered) else ordered
    equal = np.abs(level[ordered] - level[first]) <= LEVEL_AGREEMENT_M
    repeated[ordered[~starts & ~equal]] = True
    same[ordered[~starts & equal]] = True
    unsorted[rows[1:][np.diff(distance[rows]) < -TOLERANCE_M]] = True
    return repeated, same, unsorted


def _by_reason(
    check: Check, table: pd.DataFrame, mask: Flags, found: NDArray[np.object_], reason: NDArray[np.object_]
) -> pd.DataFrame:
    """Return findings whose advice is the reason of each row."""
    reasons = pd.unique(reason[mask])
    return together(
        replace(check, advice=f"{text}; {check.advice}").rows(table, mask & (reason == text), "chainage", found)
        for text in reasons
    )


def _numbers(values: Floats) -> NDArray[np.object_]:
    return np.array([f"{value:g}" for value in np.round(values, 3)], dtype=object)


def _pairs(given: Floats, label: NDArray[np.object_], off: Floats) -> NDArray[np.object_]:
    rows = zip(given, label, off, strict=True)
    return np.array([f"{at:.3f} and {text}, {apart:.3f} m apart" for at, text, apart in rows], dtype=object)
