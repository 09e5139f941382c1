"""Columns of a table as short JSON: rounded numbers, coded words, one or two characters for a cell.

The page's `data.js` is the other end of each of these: a change here is a change there.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

ALPHABET = "0123456789ABCDEFGHIJKLMNOPQRSTUVWXYZabcdefghijklmnopqrstuvwxyz"
MISSING = "-"
ROUNDING = 1.5  # percent: what rounding in the tables may take from many shares of one row

_CODES = np.array([MISSING, *ALPHABET])
_PERCENTS = np.array(["--", *(np.base_repr(n, 36).lower().rjust(2, "0") for n in range(101))])


def numbers(values: object, digits: int) -> list[float | int | None]:
    """Return numbers rounded to `digits`, whole ones without a point, None where missing.

    Examples
    --------
    >>> numbers([1.25, 2.0, float("nan"), -0.0001], 1)
    [1.2, 2, None, 0]
    """
    rounded = np.round(np.asarray(pd.to_numeric(pd.Series(values), errors="coerce"), dtype=float), digits)
    return [None if not np.isfinite(v) else int(v) if v == int(v) else float(v) for v in rounded.tolist()]


def words(values: object) -> dict[str, list[Any]]:
    """Return texts as the list of different ones, ``w``, and where each row finds its own, ``i``; -1 is missing.

    Examples
    --------
    >>> words(["lab", None, "lab", "visual"])
    {'w': ['lab', 'visual'], 'i': [0, -1, 0, 1]}
    """
    texts = pd.Series(values, dtype="string")
    codes, unique = pd.factorize(texts)
    return {"w": [str(text) for text in unique], "i": codes.tolist()}


def positions(values: object, symbols: Sequence[object]) -> NDArray[np.int64]:
    """Return the position of each value among `symbols`, -1 where it is missing or not one of them."""
    place = {symbol: k for k, symbol in enumerate(symbols)}
    codes, unique = pd.factorize(pd.Series(values, dtype="object"))
    return np.array([*(place.get(value, -1) for value in unique), -1], dtype=np.int64)[codes]  # -1 takes the last


def characters(codes: NDArray[np.int64]) -> str:
    """Return one character for each code, ``-`` for -1.

    Examples
    --------
    >>> characters(np.array([0, 11, -1]))
    '0B-'
    """
    return "".join(_CODES[codes + 1].tolist())


def whole_percents(shares: NDArray[np.float64], row: NDArray[np.int64]) -> NDArray[np.float64]:
    """Return shares as shares of whole percents, those of one `row` together 100 where they are together 1.

    Rounding each by itself would leave 99 or 101. The largest remainders are rounded up, the others down.

    Examples
    --------
    >>> whole_percents(np.array([1 / 3, 1 / 3, 1 / 3, 0.4, 0.3]), np.array([0, 0, 0, 1, 1])).tolist()
    [0.34, 0.33, 0.33, 0.4, 0.3]
    """
    percent = np.round(np.nan_to_num(shares) * 100, 6)
    whole = np.floor(percent)
    rows = int(row.max(initial=-1)) + 1
    total, floors = np.bincount(row, percent, rows), np.bincount(row, whole, rows)
    spare = np.where(np.abs(total - 100) < ROUNDING, 100, np.round(total)) - floors
    order = np.lexsort((whole - percent, row))
    first = np.searchsorted(row[order], np.arange(rows))
    rank = np.empty(len(row), dtype=np.int64)
    rank[order] = np.arange(len(row)) - first[row[order]]
    return np.where(np.isnan(shares), np.nan, (whole + (rank < spare[row])) / 100)


def percents(values: object) -> str:
    """Return two characters for each share, its percent in base 36, ``--`` where it is missing.

    Examples
    --------
    >>> percents([0.0, 0.62, 1.0, float("nan")])
    '001q2s--'
    """
    shares = np.asarray(pd.to_numeric(pd.Series(values), errors="coerce"), dtype=float)
    codes = np.where(np.isfinite(shares), np.round(np.clip(shares, 0, 1) * 100), -1).astype(np.int64)
    return "".join(_PERCENTS[codes + 1].tolist())
