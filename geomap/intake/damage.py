"""Marks that a spreadsheet leaves on entries it took for something else: dates, exponents, lost zeros."""

from __future__ import annotations

import numpy as np
import pandas as pd

from geomap.intake.entries import Flags

_MONTH = "(?:jan|feb|mar|apr|may|jun|jul|aug|sep|oct|nov|dec)"
_MONTH_NAME = "(?:Jan|Feb|Mar|Apr|May|Jun|Jul|Aug|Sep|Oct|Nov|Dec)"
_ISO = r"\d{4}-\d{1,2}-\d{1,2}(?:[ T]\d{1,2}:\d{2}.*)?"
_DATE = (
    rf"{_ISO}|\d{{1,2}}[/.]\d{{1,2}}[/.]\d{{2,4}}"
    rf"|\d{{1,2}}[- ]{_MONTH}[a-z]*(?:[- ]\d{{2,4}})?|{_MONTH}[a-z]*[- ]\d{{1,4}}"
)
# In a name only what a spreadsheet itself writes counts: "Mar-10" is damage, a boring called "MAR-10" is not.
_DATE_AS_NAME = (
    rf"{_ISO}|\d{{1,2}}[/.]\d{{1,2}}[/.]\d{{4}}|\d{{1,2}}-{_MONTH_NAME}(?:-\d{{2,4}})?|{_MONTH_NAME}-\d{{1,4}}"
)
_EXPONENT = r"\d+(?:\.\d+)?[eE]\+\d+"


def _matching(texts: pd.Series, pattern: str) -> Flags:
    return texts.str.fullmatch(pattern).fillna(False).to_numpy(dtype=bool)


def is_date(texts: pd.Series) -> Flags:
    """Return True where an entry of a number column looks like a date; `texts` are lower case.

    Examples
    --------
    >>> is_date(pd.Series(["3-apr", "2026-04-03 00:00:00", "3.4", "3-4"], dtype="string")).tolist()
    [True, True, False, False]
    """
    return _matching(texts, _DATE)


def is_damaged_name(texts: pd.Series) -> Flags:
    """Return True where a name looks like a date or a number with an exponent made by a spreadsheet.

    Examples
    --------
    >>> is_damaged_name(pd.Series(["3-Apr", "1E+05", "MAR-10", "1E05", "BH-3"], dtype="string")).tolist()
    [True, True, False, False, False]
    """
    return _matching(texts, _DATE_AS_NAME) | _matching(texts, _EXPONENT)


def may_have_lost_zeros(texts: pd.Series) -> Flags:
    """Return True for names of digits only that are shorter than others which begin with a zero.

    Examples
    --------
    >>> may_have_lost_zeros(pd.Series(["007", "8", "101"], dtype="string")).tolist()
    [False, True, False]
    """
    digits = _matching(texts, r"\d+")
    length = texts.str.len().fillna(0).to_numpy(dtype=int)
    padded = digits & texts.str.startswith("0").fillna(False).to_numpy(dtype=bool)
    width = length[padded].max() if padded.any() else 0
    return digits & (length < width) & ~padded | np.zeros(len(texts), dtype=bool)
