"""Records: the properties of one soil in each row, and how they are read and rounded.

A record table has float columns, the flags ``is_nonplastic`` and ``is_peat``, and the small codes
``fines_by_eye`` (0 unknown, 1 silt, 2 clay) and ``visual_code`` (place in the symbols of ASTM D2487, counted
from 1; 0 none, -1 a text that is no symbol). Not tested is NaN; a column that is absent was not tested.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Iterator, Mapping
from typing import Any, TypeAlias

import numpy as np
import pandas as pd
from numpy.typing import NDArray

Floats: TypeAlias = NDArray[np.float64]
Flags: TypeAlias = NDArray[np.bool_]
Arrays: TypeAlias = dict[str, NDArray[Any]]
Reading: TypeAlias = Callable[[Floats], Floats]  # how results are read: `whole` or `as_given`

FLAGS = ("is_nonplastic", "is_peat")
SMALL_CODES = ("fines_by_eye", "visual_code")
LIMITS = ("liquid_limit_pct", "plastic_limit_pct", "plasticity_index_pct")

# A half is rounded up (facts of AASHTO M 145: limits are whole numbers; ASTM D6026). The small part keeps a half
# that division left a hair short of it, such as 32.66 / 0.92.
HALF = 0.5 + 1e-9

BLOCK_ROWS = 1 << 14  # of about twenty columns, so that the work of one block stays in the processor's cache


def number(series: pd.Series[Any]) -> Floats:
    """Return a column as float64 with NaN for missing, whatever its dtype."""
    return np.asarray(series.to_numpy(dtype="float64", na_value=np.nan))


def flag(series: pd.Series[Any]) -> Flags:
    """Return a column as true or false; missing is false."""
    return np.asarray(series.astype("boolean").to_numpy(dtype="bool", na_value=False))


def arrays(records: Mapping[str, NDArray[Any]] | pd.DataFrame, names: Iterable[str]) -> Arrays:
    """Return the named columns of `records` as arrays of their kind; an absent column is all missing.

    Parameters
    ----------
    records
        Arrays of one length by name, or a table.
    names
        Columns to read.
    """
    rows = len(records) if isinstance(records, pd.DataFrame) else len(next(iter(records.values()), ()))
    read: Arrays = {}
    for name in names:
        if name not in records:
            blank: Any = False if name in FLAGS else np.int8(0) if name in SMALL_CODES else np.nan
            read[name] = np.broadcast_to(np.asarray(blank), rows)
        else:
            read[name] = _array(records[name], name)
    return read


def _array(column: NDArray[Any] | pd.Series[Any], name: str) -> NDArray[Any]:
    if name in SMALL_CODES:
        return np.asarray(column, dtype=np.int8)
    if isinstance(column, pd.Series):
        return flag(column) if name in FLAGS else number(column)
    return np.asarray(column, dtype=np.bool_ if name in FLAGS else np.float64)


def blocks(rows: int) -> Iterator[slice]:
    """Yield slices that together cover `rows` rows."""
    for first in range(0, rows, BLOCK_ROWS):
        yield slice(first, min(first + BLOCK_ROWS, rows))


def taken(columns: Arrays, rows: NDArray[Any] | slice) -> Arrays:
    """Return the rows asked for of every column."""
    result: Arrays = {}
    same: NDArray[Any] | None = None  # columns that are one value throughout, as absent ones are, need no copy
    for name, values in columns.items():
        if values.strides != (0,) or not len(values):
            result[name] = values[rows]
            continue
        same = np.empty(len(values), dtype=np.bool_)[rows] if same is None else same
        result[name] = np.broadcast_to(values[0], len(same))
    return result


def whole(values: Floats) -> Floats:
    """Return percentages rounded to whole numbers, halves up; NaN stays.

    References
    ----------
    AASHTO M 145-91, note to the tables: limits are whole numbers (from memory). ASTM D2487 is silent; the same is
    done there, as in ASTM D6913 Method A (from memory).

    Examples
    --------
    >>> whole(np.array([35.4, 35.5, 2.5])).tolist()
    [35.0, 36.0, 3.0]
    """
    return np.asarray(np.floor(values + HALF))


def as_given(values: Floats) -> Floats:
    """Return percentages as they are: the other reading that near_limit compares with."""
    return values
