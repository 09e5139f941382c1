"""Specimens: which rows of a sample table are tests of one soil.

Laboratories report the sieves of a jar on one row and its limits on another, often with depths that differ by the
length of a tube. Two rows are one specimen when

* they belong to one boring, and their depths overlap or lie within the tolerance, or they carry one sample name and
  a depth is missing on one of them,
* no kind of test stands on both. Rows of one name may repeat a value; gradations may stand on both where one curve
  ends before the other starts, as sieves and hydrometer do,
* origin, unit and visual group do not differ where both have them.

Every two rows of a specimen meet the depth rule, so a specimen cannot creep down a boring. Rows of one name are joined
first, then those whose depths agree best.
"""

from __future__ import annotations

from dataclasses import dataclass, fields
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.soils.records import LIMITS, Flags, Floats, flag, number
from geomap.tables import schema

TOLERANCE_M = 0.15  # greatest gap between the depths of one specimen; common practice, no source
_NOISE_M = 1e-9  # 1.60 - 1.45 is a hair more than 0.15 in binary

_SHAPE = ("d10_mm", "d30_mm", "d60_mm", "cu", "cc")
_TEXTS = ("origin", "unit", "visual_group")
_SHAPE_BIT, _LIMITS_BIT = 1, 2

Ints = NDArray[np.int64]


@dataclass(frozen=True)
class _Groups:
    """Rows that are one specimen as far as it is known; one entry in each array for each group.

    ``boring``, ``name`` and ``texts`` are codes, -1 for blank; ``top`` is the deepest top and ``base`` the highest
    base, NaN without a depth; ``tests`` has one bit for each kind of test but the curve, ``values`` the results;
    ``fine`` and ``coarse`` are the ends of the curve, each a size and its percent passing.
    """

    boring: Ints
    name: Ints
    top: Floats
    base: Floats
    tests: Ints
    values: Floats
    texts: Ints
    fine: Floats
    coarse: Floats

    def take(self, rows: Ints) -> _Groups:
        return _Groups(**{f.name: getattr(self, f.name)[rows] for f in fields(self)})


def join(samples: pd.DataFrame, gradations: pd.DataFrame, tolerance_m: float | None = TOLERANCE_M) -> pd.DataFrame:
    """Return the specimen of each row.

    Parameters
    ----------
    samples
        Layout ``samples``: ``boring``, ``sample``, depths [m] and tests, as far as there are any.
    gradations
        ``sample_row`` (index value in `samples`), ``size_mm``, ``passing_pct``; may be empty.
    tolerance_m
        Greatest gap between depths [m], 0 or more; None where every row is a specimen of its own.

    Returns
    -------
    On the index of `samples`: ``specimen``, numbers from 1 in the order of boring and depth; ``specimen_basis``, for
    rows that were joined which they are, their depths and the tolerance, missing for a row that stands alone.

    Examples
    --------
    >>> samples = pd.DataFrame({"boring": "B1", "top_depth_m": [1.0, 1.1], "base_depth_m": [1.4, 1.5],
    ...                         "liquid_limit_pct": [None, 40.0], "organic_pct": [2.0, None]})
    >>> join(samples, pd.DataFrame({"sample_row": [], "size_mm": [], "passing_pct": []})).specimen.tolist()
    [1, 1]
    """
    if tolerance_m is None:
        alone = np.arange(1, len(samples) + 1)
        return pd.DataFrame({"specimen": alone, "specimen_basis": _basis(samples, alone, 0.0)}, index=samples.index)
    groups = _groups(samples, gradations)
    order = _order(samples, groups)
    state = groups.take(order)
    member = np.arange(len(samples), dtype=np.int64)
    while True:
        first, second = _pairs(state, tolerance_m)
        if not len(first):
            break
        first, second = _mutual_best(state, first, second)
        # The group of the deeper top stays where it is, so that groups stay in order of depth.
        stays = np.where(np.isnan(state.top[second]), first, second)
        goes = first + second - stays
        state = _merged(state, stays, goes)
        forward = np.arange(len(state.boring))
        forward[goes] = stays
        is_left = np.ones(len(forward), dtype=bool)
        is_left[goes] = False
        member = (np.cumsum(is_left) - 1)[forward][member]
        state = state.take(np.flatnonzero(is_left))
    specimen = np.empty(len(samples), dtype=np.int64)
    specimen[order] = member + 1
    return pd.DataFrame(
        {"specimen": specimen, "specimen_basis": _basis(samples, specimen, tolerance_m)}, index=samples.index
    )


def _codes(samples: pd.DataFrame, name: str) -> Ints:
    """Return a text column as codes in order of the texts; blank, or an absent column, is -1."""
    if name not in samples:
        return np.full(len(samples), -1, dtype=np.int64)
    codes, _ = pd.factorize(samples[name].astype("string"), sort=True)
    return np.asarray(codes, dtype=np.int64)


def _column(samples: pd.DataFrame, name: str) -> Floats:
    return number(samples[name]) if name in samples else np.full(len(samples), np.nan)


def _groups(samples: pd.DataFrame, gradations: pd.DataFrame) -> _Groups:
    """Return every row as a group of its own."""
    boring, name = _codes(samples, "boring"), _codes(samples, "sample")
    top, base = _column(samples, "top_depth_m"), _column(samples, "base_depth_m")
    tests, values = _tests(samples)
    has_twin = _has_twin(boring, name)
    fine, coarse = _curve_ends(samples, gradations)
    return _Groups(
        boring=boring,
        name=name,
        top=top,
        base=np.where(np.isnan(base), top, base),
        tests=tests,
        # Results are compared between rows of one name only; without such rows they are not kept.
        values=values if has_twin else values[:, :0],
        texts=np.column_stack([_codes(samples, text) for text in _TEXTS]),
        fine=fine,
        coarse=coarse,
    )


def _tests(samples: pd.DataFrame) -> tuple[Ints, Floats]:
    """Return the kinds of tests on each row as bits, and all their results."""
    layout = schema.inputs()["samples"]
    numeric = [name for name in layout.columns if name in samples and schema.column(name).type == "number"]
    names = [name for name in numeric if not name.endswith("_depth_m")]
    values = np.column_stack([np.full((len(samples), 0), np.nan), *(number(samples[name]) for name in names)])
    tests = np.zeros(len(samples), dtype=np.int64)
    for place, name in enumerate(names):
        bit = _SHAPE_BIT if name in _SHAPE else _LIMITS_BIT if name in LIMITS else 4 << place
        tests[~np.isnan(values[:, place])] |= bit
    if "is_nonplastic" in samples:
        tests[flag(samples["is_nonplastic"])] |= _LIMITS_BIT
    return tests, values


def _has_twin(boring: Ints, name: Ints) -> bool:
    keys = pd.DataFrame({"boring": boring, "name": name})[(boring >= 0) & (name >= 0)]
    return bool(keys.duplicated().any())


def _curve_ends(samples: pd.DataFrame, gradations: pd.DataFrame) -> tuple[Floats, Floats]:
    """Return size and percent passing at the fine and at the coarse end of each row's curve, NaN without one."""
    ends = np.full((2, len(samples), 2), np.nan)
    if len(gradations):
        row = samples.index.get_indexer(pd.Index(gradations["sample_row"]))
        size, passing = number(gradations["size_mm"]), number(gradations["passing_pct"])
        keep = np.flatnonzero((row >= 0) & ~np.isnan(size) & ~np.isnan(passing))
        order = keep[np.lexsort((size[keep], row[keep]))]
        for end, places in zip(ends, (order[::-1], order), strict=True):
            end[row[places], 0], end[row[places], 1] = size[places], passing[places]
    return ends[0], ends[1]


def _order(samples: pd.DataFrame, groups: _Groups) -> Ints:
    """Return rows by boring and depth; ties by what the rows say, so that their order in the file means nothing."""
    source = [_column(samples, "row_number"), _codes(samples, "sheet"), _codes(samples, "file")]
    keys = [*groups.texts.T, groups.tests, *source, groups.name, groups.base, groups.top, groups.boring]
    return np.asarray(np.lexsort(keys), dtype=np.int64)


def _pairs(state: _Groups, tolerance_m: float) -> tuple[Ints, Ints]:
    """Return pairs of groups that may be one specimen."""
    found = [(np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64))]
    for step in range(1, len(state.boring)):  # ends when no group reaches down to the one `step` places on
        first = np.flatnonzero(
            (state.boring[:-step] == state.boring[step:])
            & (state.boring[:-step] >= 0)
            & (state.top[step:] - state.base[:-step] <= tolerance_m + _NOISE_M)
        )
        if not len(first):
            break
        second = first + step
        is_near = state.top[second] - state.base[second] <= tolerance_m + _NOISE_M
        found.append((first[is_near], second[is_near]))
    found.append(_pairs_by_name(state))
    first, second = (np.concatenate(part) for part in zip(*found, strict=True))
    fits = _are_compatible(state, first, second)
    return first[fits], second[fits]


def _pairs_by_name(state: _Groups) -> tuple[Ints, Ints]:
    """Return pairs of one boring and one name of which one has no depth."""
    found = [(np.zeros(0, dtype=np.int64), np.zeros(0, dtype=np.int64))]
    named = np.flatnonzero((state.name >= 0) & (state.boring >= 0))
    if np.isnan(state.top[named]).any():
        order = named[np.lexsort((named, state.name[named], state.boring[named]))]
        for step in range(1, len(order)):
            first, second = order[:-step], order[step:]
            is_one = (state.boring[first] == state.boring[second]) & (state.name[first] == state.name[second])
            if not is_one.any():
                break
            is_one &= np.isnan(state.top[first]) | np.isnan(state.top[second])
            found.append((first[is_one], second[is_one]))
    first, second = (np.concatenate(part) for part in zip(*found, strict=True))
    return np.minimum(first, second), np.maximum(first, second)


def _are_compatible(state: _Groups, first: Ints, second: Ints) -> Flags:
    a, b = state.take(first), state.take(second)
    has_name = (a.name == b.name) & (a.name >= 0)
    shared = a.tests & b.tests
    differs = ((a.values != b.values) & ~np.isnan(a.values) & ~np.isnan(b.values)).any(axis=1)
    tests_fit = (shared == 0) | (has_name & ~differs & (shared & _SHAPE_BIT == 0))
    has_curve = ~np.isnan(a.fine[:, 0]), ~np.isnan(b.fine[:, 0])
    is_graded = [curve | (part.tests & _SHAPE_BIT > 0) for curve, part in zip(has_curve, (a, b), strict=True)]
    curves_fit = has_curve[0] & has_curve[1] & (_continues(a, b) | _continues(b, a))
    texts_fit = ((a.texts == b.texts) | (a.texts < 0) | (b.texts < 0)).all(axis=1)
    return np.asarray(tests_fit & texts_fit & (curves_fit | ~(is_graded[0] & is_graded[1])))


def _continues(finer: _Groups, coarser: _Groups) -> Flags:
    """Return whether one curve ends, in size and in percent, before the other starts."""
    before: Flags = (finer.coarse[:, 0] < coarser.fine[:, 0]) & (finer.coarse[:, 1] <= coarser.fine[:, 1])
    return before


def _mutual_best(state: _Groups, first: Ints, second: Ints) -> tuple[Ints, Ints]:
    """Return the pairs of which each is the best choice of the other: one name, then the least difference in depth."""
    apart = np.abs(state.top[first] - state.top[second]) + np.abs(state.base[first] - state.base[second])
    has_other_name = (state.name[first] != state.name[second]) | (state.name[first] < 0)
    rank = np.empty(len(first), dtype=np.int64)
    rank[np.lexsort((second, first, np.round(apart, 6), has_other_name))] = np.arange(len(first))
    best = np.full(len(state.boring), len(first), dtype=np.int64)
    np.minimum.at(best, first, rank)
    np.minimum.at(best, second, rank)
    is_mutual = (best[first] == rank) & (best[second] == rank)
    return first[is_mutual], second[is_mutual]


def _merged(state: _Groups, stays: Ints, goes: Ints) -> _Groups:
    """Return the groups with what `goes` held added to `stays`."""
    a, b = state.take(stays), state.take(goes)
    is_finer = np.nan_to_num(b.fine[:, 0], nan=np.inf) < np.nan_to_num(a.fine[:, 0], nan=np.inf)
    is_coarser = np.nan_to_num(b.coarse[:, 0], nan=-np.inf) > np.nan_to_num(a.coarse[:, 0], nan=-np.inf)
    has_one_name = (a.name == b.name) | (np.minimum(a.name, b.name) < 0)
    held = _Groups(
        boring=a.boring,
        name=np.where(has_one_name, np.maximum(a.name, b.name), -1),
        top=np.fmax(a.top, b.top),
        base=np.fmin(a.base, b.base),
        tests=a.tests | b.tests,
        values=np.where(np.isnan(a.values), b.values, a.values),
        texts=np.maximum(a.texts, b.texts),
        fine=np.where(is_finer[:, None], b.fine, a.fine),
        coarse=np.where(is_coarser[:, None], b.coarse, a.coarse),
    )
    result = state.take(np.arange(len(state.boring)))
    for f in fields(result):
        getattr(result, f.name)[stays] = getattr(held, f.name)
    return result


def _basis(samples: pd.DataFrame, specimen: Ints, tolerance_m: float) -> pd.Series[Any]:
    """Return for joined rows which they are, missing for a row that stands alone."""
    text = pd.Series(pd.NA, index=samples.index, dtype="string")
    rows = np.flatnonzero(np.bincount(specimen)[specimen] > 1)
    if not len(rows):
        return text
    part, which = samples.iloc[rows], specimen[rows]
    rows_in_file = part.get("row_number", part.index)
    files = part["file"].fillna("") if "file" in part else [""] * len(part)
    depths = [_column(part, name) for name in ("top_depth_m", "base_depth_m")]
    said = pd.Series(
        [
            f"{file} row {row}".strip() + _depth(top, base)
            for file, row, top, base in zip(files, rows_in_file, *depths, strict=True)
        ],
        dtype="string",
    )
    reason = f": one specimen, depths within {tolerance_m:g} m or one name (tolerance: common practice, no source)"
    order = np.lexsort((_column(part, "row_number"), which))
    together = said.iloc[order].groupby(which[order]).agg(" and ".join) + reason
    text.iloc[rows] = together.reindex(which).to_numpy(dtype=object)
    return text


def _depth(top: float, base: float) -> str:
    if np.isnan(top):
        return ""
    return f" ({top:g} m)" if np.isnan(base) else f" ({top:g} to {base:g} m)"
