"""Particle sizes as labs write them: ``No. 200``, ``#40``, ``3/4 in``, ``0.075 mm``, ``75 um``.

The sizes of named sieves are in `sieves.toml`, with their source.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Mapping
from fractions import Fraction
from functools import cache
from importlib import resources
from types import MappingProxyType

from geomap.readers.spelling import plain
from geomap.units import INCH_MM, SPELLINGS

MAX_SIZE_MM = 3000.0  # the largest size that columns.toml allows

# "P200" without a unit names a US sieve. Only the sieves that ASTM D2487 and AASHTO M 145 rest on are taken so:
# for the others, "P20" may as well be 20 mm.
FINES_MM = 0.075  # the size below which soil is fines; ASTM D2487-17, section 3
NUMBERS_WITHOUT_UNIT = ("4", "10", "40", "200")

_GAP = r"(?:[\s_\-]|\.(?!\d))*"  # a dot before a digit belongs to the number
_NUMBERED = re.compile(rf"(?:u\.?s\.?{_GAP})?(?:sieve{_GAP})?(?:number|no|nr|#)[\s._\-]*#?{_GAP}(\d+(?:[ \-]1/2)?)")
_METRIC = re.compile(rf"(\d+(?:[.,_]\d+)?|[.,]\d+){_GAP}(mm|μm|um|microns?|millimet(?:er|re)s?)")
_METRIC_IN_WORDS = re.compile(rf"(\d+)[ .\-]+(\d+){_GAP}(mm)")
_INCH_MARK = re.compile(rf"(.*\d){_GAP}(?:\"|''|inch(?:es)?|in)\.?")
_FRACTION = re.compile(r"(?:(\d+)[ \-]+)?(\d+)/(\d+)|(\d+(?:\.\d+)?|\.\d+)")
_SECOND_NAME = re.compile(r"(.+?)\s*[(\[,]\s*(.+?)\s*[)\]]?")

_PERCENT = r"(?:%|percent|pct)"
_FINER = r"(?:passing|pass|finer(?: than)?|smaller than|less than|<|minus|-)"
_BEFORE = re.compile(
    rf"{_PERCENT}?(?:{_GAP}by mass)?(?:[\s_]|\.(?!\d))*(?P<finer>{_FINER})?{_GAP}(?P<sieve>sieve)?{_GAP}"
)
_AFTER = re.compile(
    rf"(?:[\s._\-,]*(?:[(\[]\s*{_PERCENT}?\s*(?:passing|finer)?\s*[)\]]|sieve|passing|finer|{_PERCENT}))+$"
)
_FINES = re.compile(
    rf"{_PERCENT}[\s._\-]*fines(?:[\s._\-]+content)?|fines(?:[\s._\-]+content)?[\s._\-,]*[(\[]?\s*{_PERCENT}\s*[)\]]?"
)
_SHORT = re.compile(rf"p{_GAP}(\d+\.\d+|\d+)")


@cache
def sieve_sizes() -> Mapping[str, float]:
    """Return the size in millimeters of each named sieve, ``"No. 200"`` or ``"3/4 in"``, coarsest first."""
    table = tomllib.loads((resources.files("geomap.readers") / "sieves.toml").read_text("utf-8"))
    return MappingProxyType({entry["name"]: float(entry["size_mm"]) for entry in table["sieves"]})


@cache
def _sizes_by_inches() -> Mapping[Fraction, float]:
    names = ((name.removesuffix(" in"), size) for name, size in sieve_sizes().items() if name.endswith(" in"))
    return MappingProxyType({value: size for name, size in names if (value := _inches(name)) is not None})


def _inches(text: str) -> Fraction | None:
    match = _FRACTION.fullmatch(text.strip())
    if match is None:
        return None
    whole, over, under, decimal = match.groups()
    if decimal is not None:
        return Fraction(decimal)
    return Fraction(int(whole or 0)) + Fraction(int(over), int(under)) if int(under) else None


def size_from_inches(text: str) -> float | None:
    """Return the size in millimeters of an opening in inches, a number or a fraction; None for other text.

    An opening that names a sieve has the nominal size of that sieve; any other is 25.4 mm to the inch.

    Examples
    --------
    >>> size_from_inches("3/4"), size_from_inches("0.75"), size_from_inches("1-1/2"), size_from_inches("10")
    (19.0, 19.0, 37.5, 254.0)
    """
    value = _inches(text)
    if value is None:
        return None
    return _bounded(_sizes_by_inches().get(value, round(float(value) * INCH_MM, 6)))


def _bounded(size_mm: float) -> float | None:
    return size_mm if 0 < size_mm <= MAX_SIZE_MM else None


def _metric(number: str, unit: str) -> float | None:
    size = float(number.replace(",", ".").replace("_", "."))
    return _bounded(size * SPELLINGS["mm"].get(unit.rstrip("s"), 1.0))


def size_from_text(text: str) -> float | None:
    """Return the size in millimeters that a text states with its unit or sieve number, or None.

    A second name in brackets must state the same sieve (within 2 %).

    Examples
    --------
    >>> size_from_text("No. 200"), size_from_text('1 1/2"'), size_from_text("75 µm"), size_from_text("19")
    (0.075, 37.5, 0.075, None)
    >>> size_from_text("No. 200 (0.075 mm)"), size_from_text("No. 200 (0.063 mm)")
    (0.075, None)
    """
    text = plain(text)
    numbered = _NUMBERED.fullmatch(text)
    if numbered:
        return sieve_sizes().get("No. " + numbered.group(1).replace(" ", "-"))
    metric = _METRIC.fullmatch(text)
    if metric:
        return _metric(*metric.groups())
    inches = _INCH_MARK.fullmatch(text)
    if inches:
        return size_from_inches(inches.group(1))
    both = _SECOND_NAME.fullmatch(text)
    if both is None:
        return None
    first, second = size_from_text(both.group(1)), size_from_text(both.group(2))
    alike = first is not None and second is not None and abs(first - second) <= 0.02 * first
    return first if alike else None


def size_from_heading(heading: str) -> float | None:
    """Return the size in millimeters if a heading means percent passing a size, or None.

    Examples
    --------
    >>> [size_from_heading(h) for h in ("passing_4_75_mm_pct", "% passing No. 200", "P200", "#40", "sieve 19 mm")]
    [4.75, 0.075, 0.075, 0.425, 19.0]
    >>> size_from_heading("retained 4.75 mm") is None, size_from_heading("2-60 mm") is None
    (True, True)
    """
    text = _AFTER.sub("", plain(heading))
    short = _SHORT.fullmatch(text)
    if short:
        return _size_without_unit(short.group(1), NUMBERS_WITHOUT_UNIT)
    before = _BEFORE.match(text)
    rest = text[before.end() :] if before else text
    size = size_from_text(rest) or size_from_text(text)
    if size is not None or before is None or not before.group("finer"):
        return size
    in_words = _METRIC_IN_WORDS.fullmatch(rest)
    if in_words:
        return _metric(f"{in_words.group(1)}.{in_words.group(2)}", in_words.group(3))
    return size_from_inches(rest) if "/" in rest else _size_without_unit(rest, NUMBERS_WITHOUT_UNIT[-1:])


def is_percent_fines(heading: str) -> bool:
    """Return whether a heading means the percentage of fines: what passes the 0.075 mm sieve (ASTM D2487-17, 3.1).

    Examples
    --------
    >>> [is_percent_fines(h) for h in ("% Fines", "Fines (%)", "fines_pct", "Fines content, %", "Fines", "% fine sand")]
    [True, True, True, True, False, False]
    """
    return _FINES.fullmatch(plain(heading)) is not None


def _size_without_unit(number: str, taken: tuple[str, ...]) -> float | None:
    """Return the size for a bare number: a sieve number in `taken`, or a metric size that cannot be inches."""
    if number in taken:
        return sieve_sizes()[f"No. {number}"]
    if not re.fullmatch(r"\d+\.\d+", number) or Fraction(number) in _sizes_by_inches():
        return None
    return float(number) if float(number) in sieve_sizes().values() else None
