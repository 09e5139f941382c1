"""Findings that repeat word for word, said once with the rows they are about."""

from __future__ import annotations

from collections.abc import Iterable

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.tables import findings

EVERY_SEVERITY = ("note", "warning", "error")


def gathered(parts: Iterable[pd.DataFrame], limit: int = 20, severities: Iterable[str] = ("note",)) -> pd.DataFrame:
    """Return findings as one table, those that repeat word for word given once with the rows they are about.

    Parameters
    ----------
    parts
        Tables of findings.
    limit
        More than this many findings about one heading of one sheet, with the same text found, become one;
        its ``found`` then ends in the number of rows and which. More than this many different texts become one too.
    severities
        Findings of other severities stay one by one.

    Examples
    --------
    >>> from geomap.tables.findings import Check
    >>> check = Check("no result in words", "convert", "a number", "leave the cell blank")
    >>> cells = pd.DataFrame({"file": "lab.csv", "sheet": "", "row_number": range(2, 32)})
    >>> once = gathered([check.rows(cells, np.ones(30, dtype=bool), "LL", "n/a")])
    >>> once[["row_number", "found"]].values.tolist()
    [[2, 'n/a (in 30 rows: 2-31)']]
    """
    table = findings.together(parts)
    if len(table) <= limit:
        return table
    same = ["file", "sheet", "heading", "topic", "action", "severity", "advice"]
    keys = table[[*same, "found"]].fillna("")
    varied = (keys.groupby(same)["found"].transform("nunique") > limit) & (limit > 1)
    number = keys.assign(found=keys["found"].mask(varied, "")).groupby([*same, "found"], sort=False).ngroup()
    many = table["severity"].isin(list(severities)) & table["row_number"].notna()
    many &= number.groupby(number).transform("size") > limit
    if not many.any():
        return table
    groups = table.loc[many].groupby(number[many])
    first = many & ~number.duplicated()
    words = groups["row_number"].agg(lambda rows: f" (in {len(rows)} rows: {row_ranges(rows.to_numpy(dtype=int))})")
    words = words.mask(groups["found"].nunique() > 1, " and others" + words)
    table.loc[first, "found"] += number[first].map(words)  # on these rows alone: the lists of rows are long
    for name in ("boring", "sample"):
        differs = number.map(groups[name].nunique(dropna=False)) > 1
        table[name] = table[name].mask(first & differs)
    return table.loc[~many | first].reset_index(drop=True)


def row_ranges(numbers: NDArray[np.int_]) -> str:
    """Return row numbers in words.

    Examples
    --------
    >>> row_ranges(np.array([7, 2, 3, 4, 9]))
    '2-4, 7, 9'
    """
    ordered = np.unique(numbers)
    starts = np.flatnonzero(np.diff(ordered, prepend=ordered[0] - 2) > 1)
    ends = np.append(starts[1:], len(ordered)) - 1
    spans = zip(ordered[starts], ordered[ends], strict=True)
    return ", ".join(f"{a}" if a == b else f"{a}-{b}" for a, b in spans)
