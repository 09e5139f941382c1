"""One heading: the column of geomap that it means, and the unit that it states.

A heading is compared with the names, titles and aliases of `columns.toml`, only those of the layout at hand, in any
case and with anything between words. A unit may follow: ``depth_ft``, ``Depth (ft)``, ``Depth [m]``, ``Depth, ft``.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache, lru_cache
from types import MappingProxyType

from geomap.readers.sieves import FINES_MM, is_percent_fines, size_from_heading
from geomap.readers.spelling import key, plain, unit_factor, unit_key
from geomap.tables import schema
from geomap.tables.schema import Column, Layout, passing_column

MAX_HEADING_LENGTH = 120  # ours: longer cells are text, not headings
UNIT_WORDS = 3  # a unit at the end has at most so many words: "us survey foot"

# Words after a unit that say from where or of what, without spaces. Those of levels behind a depth are no depth.
_DEPTH_WORDS = "bgl|bgs|bg|belowground(?:level|surface)?"
_LEVEL_WORDS = "aod|od|amsl|asl|msl|abovedatum"
_MASS_WORDS = "(?:by|of)?dry(?:mass|weight)|bymass|byweight"

_BRACKET = re.compile(r"(.*\S)\s*[(\[]\s*([^()\[\]]+?)\s*[)\]]")
_COMMA = re.compile(r"(.*\S)\s*,\s*([^,]+)")
_STROKE = re.compile(r"(.*\S)\s*/\s*([^/]+)")
_PERCENT_SIGN = re.compile(r"(.*[^\s._\-(])[\s._\-]*(%)")
_WORD_ENDS = re.compile(r"[\s._\-]+")
_DEGREES = ("deg", "degree", "degrees", "°", "decimal degrees", "dd")


@dataclass(frozen=True)
class Reading:
    """What a heading was taken to mean.

    Attributes
    ----------
    column
        Column of geomap.
    unit
        Unit as the heading spells it; blank where it states none.
    factor
        Factor to the unit of the column; None where the heading states no unit.
    """

    column: str
    unit: str = ""
    factor: float | None = None


@dataclass(frozen=True)
class UnknownUnit:
    """A heading that means a column, in a unit that the column cannot have."""

    column: str
    unit: str


@cache
def _names(layout_name: str) -> tuple[Mapping[str, str], Mapping[str, str]]:
    """Return two mappings to columns: from every key, and from names without their unit."""
    whole: dict[str, str] = {}
    stems: dict[str, str] = {}
    for name in schema.inputs()[layout_name].columns:
        column = schema.column(name)
        title = re.sub(r"\s*\([^)]*\)$", "", column.title)
        for spelling in (*column.aliases, title, name):
            whole.setdefault(key(spelling), name)
        whole[key(name)] = name
        stems.setdefault(key(name.removesuffix("_" + column.unit)), name)
    return MappingProxyType(whole), MappingProxyType(stems)


def spellings(layout: Layout) -> Mapping[str, tuple[str, ...]]:
    """Return for each column of `layout` the headings that mean it, its own name first."""
    return {name: (name, *schema.column(name).aliases) for name in layout.columns}


@lru_cache(maxsize=65536)
def _reading(heading: str, layout_name: str) -> Reading | UnknownUnit | None:
    layout = schema.inputs()[layout_name]
    text = plain(heading)
    if not 0 < len(text) <= MAX_HEADING_LENGTH:
        return None
    whole, stems = _names(layout_name)
    unknown: UnknownUnit | None = None
    for base, unit, is_marked in _splits(text):
        name = _column(base, whole) or stems.get(key(base))
        if name is None:
            continue
        stated = stated_unit(schema.column(name), unit)
        if stated is not None:
            return Reading(name, unit, stated)
        if is_marked and unknown is None:
            unknown = UnknownUnit(name, unit)
    if (name := _column(text, whole)) is not None:
        house = schema.column(name).unit
        is_canonical = key(text) == key(name) and house not in ("", "crs")
        return Reading(name, house, 1.0) if is_canonical else Reading(name)
    if layout.takes_passing and (size := size_from_heading(text)) is not None:
        return Reading(passing_column(size), "%", 1.0)
    if layout.takes_passing and is_percent_fines(text):
        return Reading(passing_column(FINES_MM), "%", 1.0)
    return unknown


def reading(heading: str, layout: Layout) -> Reading | UnknownUnit | None:
    """Return what a heading means in a layout, or None where it means nothing there.

    Examples
    --------
    >>> samples = schema.inputs()["samples"]
    >>> reading("Top Depth (ft)", samples)
    Reading(column='top_depth_m', unit='ft', factor=0.3048)
    >>> reading("LL", samples), reading("% passing No. 200", samples).column
    (Reading(column='liquid_limit_pct', unit='', factor=None), 'passing_0_075_mm_pct')
    >>> reading("Top depth (kPa)", samples), reading("Weather", samples)
    (UnknownUnit(column='top_depth_m', unit='kpa'), None)
    """
    return _reading(heading, layout.name)


def reading_as(heading: str, column: Column) -> Reading:
    """Return the reading of a heading that the user says means `column`; only its unit is looked for."""
    for _, unit, _ in _splits(plain(heading)):
        stated = stated_unit(column, unit)
        if stated is not None:
            return Reading(column.name, unit, stated)
    if key(heading) == key(column.name) and column.unit not in ("", "crs"):
        return Reading(column.name, column.unit, 1.0)
    return Reading(column.name)


def stated_unit(column: Column, unit: str) -> float | None:
    """Return the factor of a unit for a column, or None where the column cannot be in it.

    Coordinates and chainages are labels in the unit of their coordinate system or format: their unit is taken note
    of, with the factor 1.

    Examples
    --------
    >>> stated_unit(schema.column("top_depth_m"), "ft bgl"), stated_unit(schema.column("top_depth_m"), "m AOD")
    (0.3048, None)
    """
    if column.unit == "crs" or column.name == "chainage":
        is_unit = unit_factor("m", unit) is not None or (column.unit == "crs" and unit.strip() in _DEGREES)
        return 1.0 if is_unit else None
    factor = unit_factor(column.unit, unit)
    if factor is not None:
        return factor
    words = _MASS_WORDS if column.unit == "pct" else None
    if column.unit == "m":
        words = _DEPTH_WORDS if "depth" in column.name else _LEVEL_WORDS if "level" in column.name else None
    bare = re.sub(f"(?<=.)(?:{words})$", "", unit_key(unit)) if words else ""
    return unit_factor(column.unit, bare) if bare else None


def _column(text: str, names: Mapping[str, str]) -> str | None:
    """Return the column of a heading without its unit, also where it says its name twice: Liquid limit (LL)."""
    name = names.get(key(text))
    for pattern in (_BRACKET, _COMMA):
        match = pattern.fullmatch(text)
        if name is None and match and names.get(key(match.group(1))) == names.get(key(match.group(2))):
            name = names.get(key(match.group(1)))
    return name


def _splits(text: str) -> Iterator[tuple[str, str, bool]]:
    """Yield ways to part a heading into a name and a unit; the last item says whether a sign parts them."""
    for pattern in (_BRACKET, _COMMA, _STROKE, _PERCENT_SIGN):
        match = pattern.fullmatch(text)
        if match:
            yield match.group(1), match.group(2), pattern in (_BRACKET, _COMMA)
    ends = [match.span() for match in _WORD_ENDS.finditer(text)]
    for start, end in reversed(ends[-UNIT_WORDS:]):
        if start and text[end:]:
            yield text[:start], text[end:], False
