"""Chainage labels as text: ``12+345.6`` in meters by the kilometer, ``123+45.6`` in feet by the hundred.

Read are, in any case and with spaces anywhere: ``12+345.6`` (``123+45.6``), with ``CH``, ``STA``, ``KM`` or the like
before it; a plain number in the unit of the format; a number with its unit (``12345.6 m``, ``12.345 km``); and
``km 12.345``. A label in the other format is refused, not guessed at: the digits after the plus sign tell them apart.
"""

from __future__ import annotations

import re
from collections.abc import Iterable

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray

from geomap.units import INTERNATIONAL_FOOT_M, factor_from_spelling

Floats = NDArray[np.float64]

FORMATS = {"0+000": 3, "0+00": 2}  # digits after the plus sign
KILOMETER_M = 1000.0
NOT_GIVEN = "not given"

_PREFIX = r"(?P<prefix>CHAINAGE|CHAIN|CH|STATION|STA|KM|K|PK)?[.:]?"
_PLUS = re.compile(_PREFIX + r"(?P<sign>-?)(?P<major>\d+)\+(?P<minor>\d+)(?P<decimals>\.\d*)?(?P<unit>[A-Z-]*)")
_PLAIN = re.compile(_PREFIX + r"(?P<number>-?(?:\d+\.?\d*|\.\d+))(?P<unit>[A-Z-]*)")
_KILOMETER_PREFIXES = ("KM", "K", "PK")


def read(labels: Iterable[object], form: str, unit_m: float) -> tuple[Floats, list[str]]:
    """Return chainage values [m] and, where a label cannot be read, the reason.

    Parameters
    ----------
    labels
        Texts; missing ones stay missing, with the reason "not given".
    form
        One of :data:`FORMATS`.
    unit_m
        Meters in one unit of the labels: 1, or those in a foot.

    Examples
    --------
    >>> values, reasons = read(["12+345.6", "km 12.5", "CH 12345.6", "123+45"], "0+000", 1.0)
    >>> values.tolist()
    [12345.6, 12500.0, 12345.6, nan]
    >>> reasons[3]
    '2 digits after the plus sign: this is not a chainage as 0+000'
    """
    found = [_read_one(label, form, unit_m) for label in labels]
    return np.array([value for value, _ in found], dtype=float), [reason for _, reason in found]


def _read_one(label: object, form: str, unit_m: float) -> tuple[float, str]:
    if not isinstance(label, str) or not label.strip():
        return np.nan, NOT_GIVEN
    text = re.sub(r"\s+", "", label).upper().replace("\N{MINUS SIGN}", "-")
    if match := _PLUS.fullmatch(text):
        return _read_plus(match, form, unit_m)
    if match := _PLAIN.fullmatch(text):
        factor = _factor(match["prefix"] or "", match["unit"], form, unit_m)
        if factor is not None:
            return float(match["number"]) * factor, ""
    if "," in text:
        return np.nan, "a comma is not read: write a point before decimals, and nothing between thousands"
    return np.nan, f"no chainage can be read from it: write it as {_example(form)}"


def _read_plus(match: re.Match[str], form: str, unit_m: float) -> tuple[float, str]:
    digits = FORMATS[form]
    if len(match["minor"]) != digits:
        return np.nan, f"{len(match['minor'])} digits after the plus sign: this is not a chainage as {form}"
    factor = _factor("", match["unit"], form, unit_m)
    if factor != unit_m:
        return np.nan, f"unit {match['unit'].lower()}: chainages as {form} are in {_unit_name(form)}"
    value = (int(match["major"]) * 10**digits + float(match["minor"] + (match["decimals"] or ""))) * unit_m
    return (-value if match["sign"] else value), ""


def _factor(prefix: str, unit: str, form: str, unit_m: float) -> float | None:
    """Return meters in one unit of a plain number, or None where its unit is not one of length."""
    if not unit:
        return KILOMETER_M if prefix in _KILOMETER_PREFIXES else unit_m
    factor = factor_from_spelling("m", unit)
    # In a chainage in feet, "ft" is the foot of that chainage, be it the international or the US survey foot.
    return unit_m if form == "0+00" and factor == INTERNATIONAL_FOOT_M else factor


def _unit_name(form: str) -> str:
    return "feet" if form == "0+00" else "meters"


def _example(form: str) -> str:
    return "123+45.6, in feet" if form == "0+00" else "12+345.6, in meters"


def written(chainage_m: ArrayLike, form: str, unit_m: float, decimals: int = 3) -> list[str | None]:
    """Return labels of chainage values [m], None where missing; zeros at the end of the decimals are left off.

    Parameters
    ----------
    chainage_m
        Shape (n,).
    form, unit_m
        As in :func:`read`.
    decimals
        At most so many.

    Examples
    --------
    >>> written([12345.6, 0.0, -50.0, 999.9999], "0+000", 1.0)
    ['12+345.6', '0+000', '-0+050', '1+000']
    >>> written([3762.95328], "0+00", 0.3048)
    ['123+45.647']
    """
    values = np.atleast_1d(np.asarray(chainage_m, dtype=float)) / unit_m
    known = np.isfinite(values)
    parts = 10**decimals
    counts = np.rint(np.where(known, values, 0.0) * parts).astype(np.int64)
    whole, fraction = np.divmod(np.abs(counts), parts)
    major, minor = np.divmod(whole, 10 ** FORMATS[form])
    signs = np.where(counts < 0, "-", "")
    rows = zip(known, signs, major, minor, fraction, strict=True)
    return [
        f"{sign}{big}+{small:0{FORMATS[form]}d}{_decimals(part, decimals)}" if is_known else None
        for is_known, sign, big, small, part in rows
    ]


def _decimals(fraction: int, decimals: int) -> str:
    return f".{fraction:0{decimals}d}".rstrip("0") if fraction else ""


def as_texts(labels: object) -> list[object]:
    """Return labels given as one text, a list or a series, as a list; missing ones are None."""
    if isinstance(labels, str):
        return [labels]
    series = pd.Series(labels, dtype=object)
    return [None if missing else label for label, missing in zip(series, series.isna(), strict=True)]
