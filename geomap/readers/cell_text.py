"""Values of workbooks and layers as text: what a spreadsheet shows, without the noise of binary numbers."""

from __future__ import annotations

import datetime as dt
import math

import numpy as np

DIGITS = 15  # significant digits that a spreadsheet stores and shows; a double holds 15 to 17
SINGLE_DIGITS = 7  # of a 4-byte number, as GIS layers hold


def text_from_value(value: object, is_percent: bool = False) -> str:
    """Return one value as text; blank for nothing.

    Parameters
    ----------
    value
        Text, number, truth value, date, time or None.
    is_percent
        The cell shows its number as a percentage: 0.125 is written ``12.5%``, as on the screen.

    Examples
    --------
    >>> [text_from_value(value) for value in (12.0, 0.075, 0.1 + 0.2, True, None, float("nan"))]
    ['12', '0.075', '0.3', 'TRUE', '', '']
    >>> text_from_value(dt.datetime(2024, 5, 1)), text_from_value(0.125, is_percent=True)
    ('2024-05-01', '12.5%')
    """
    if isinstance(value, np.float32):
        return _number(float(value), SINGLE_DIGITS)
    value = value.item() if isinstance(value, np.generic) else value
    if isinstance(value, bool):
        return "TRUE" if value else "FALSE"
    if isinstance(value, (int, float)):
        return _number(value * 100, DIGITS) + "%" if is_percent else _number(value, DIGITS)
    if isinstance(value, (dt.date, dt.time)):
        return _moment(value)
    if isinstance(value, bytes):
        return value.decode("utf-8", "replace")
    return "" if value is None else str(value)


def _moment(value: dt.date | dt.time) -> str:
    if not isinstance(value, dt.datetime):
        return value.isoformat()
    return value.date().isoformat() if value.time() == dt.time() else value.isoformat(sep=" ")


def _number(value: float, digits: int) -> str:
    if isinstance(value, int):
        return str(value)
    if math.isnan(value):
        return ""
    if math.isfinite(value) and value == round(value) and abs(value) < 1e15:
        return str(int(value))
    return f"{value:.{digits}g}"
