"""The headings of one table, resolved: column, unit and factor of each, or the reason why not."""

from __future__ import annotations

import math
import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

import pandas as pd

from geomap.errors import InputError, UsageError, problem
from geomap.readers.heading_messages import check_mapped, missing_text, units_in_words
from geomap.readers.heading_rows import FINES_COLUMN, mapping, readings, unique_labels
from geomap.readers.headings import Reading, UnknownUnit, stated_unit
from geomap.readers.options import TableOptions
from geomap.readers.sheets import Place, column_letters
from geomap.readers.sieves import is_percent_fines
from geomap.readers.spelling import is_unit, key, plain, unit_factor
from geomap.readers.unread_headings import about_unread
from geomap.tables import schema
from geomap.tables.findings import Check, together
from geomap.tables.raw import Heading
from geomap.tables.schema import Layout
from geomap.units import LENGTH_UNITS

_SIEVE_NUMBER = re.compile(r"p(?:4|10|40)(?:%|pct)?")

UNIT_NOT_KNOWN = Check(
    "unit of the heading not known",
    "hold_out",
    "a unit that the column can have",
    "column not read; correct its unit",
)
LENGTH_UNIT = Check(
    "length unit", "convert", "a unit in the heading", "taken in the corridor's length_unit; add the unit to be sure"
)
UNITS_ROW = Check("units row", "accept", "units in the headings", "row beneath the headings read as their units")
REPEATED = Check("heading twice", "accept", "each heading once", "not used; a number was added to its name")
SIEVE_NUMBER = Check(
    "sieve number", "accept", "a size with its unit", "read as a US sieve number; write the size in mm if it is one"
)
FINES = Check(
    "percent fines",
    "convert",
    "percent passing 0.075 mm",
    "taken as percent passing 0.075 mm (No. 200), the fines of ASTM D2487; name the size if it is another",
)


@dataclass(frozen=True)
class Headings:
    """Headings of one table, resolved.

    Attributes
    ----------
    labels
        One name for each column of the file, as found, made unique.
    taken
        Column of geomap -> its heading; ``found`` is one of `labels`.
    unrecognized
        Labels that mean nothing in the layout.
    findings
        What there is to say about them.
    """

    labels: tuple[str, ...]
    taken: Mapping[str, Heading]
    unrecognized: tuple[str, ...]
    findings: pd.DataFrame


def resolve(
    row: Sequence[str],
    layout: Layout,
    options: TableOptions,
    place: Place,
    units: Sequence[str] = (),
    given: Collection[str] = (),
) -> Headings:
    """Return the headings of a row with their columns, units and factors.

    Parameters
    ----------
    row
        The heading row.
    layout, options
        Which table it is, and what the corridor file says about it.
    place
        Where the row stands, for messages and findings.
    units
        The units row beneath, if there is one.
    given
        Columns that come from elsewhere than a heading; headings that mean them are left unrecognized.

    Raises
    ------
    InputError
        A required heading is missing, two headings mean one column, or a heading and the units row disagree.
    UsageError
        A heading of the user's own is not in the file.
    """
    mapped = mapping(layout, options, str(place))
    check_mapped(row, mapped, str(place))
    labels = unique_labels(row)
    means = [None if item is not None and item.column in given else item for item in readings(row, layout, mapped)]
    positions = _positions(row, means, place)
    missing = [name for name in layout.required if name not in positions and name not in given]
    if missing or not (positions or given):
        raise InputError(missing_text(row, layout, missing, means, str(place)))
    taken = {}
    notes = _notes(row, labels, means, place)
    for name, (position, item) in positions.items():
        stated = _stated(item, labels[position], units[position] if position < len(units) else "", place)
        factor, unit = stated or _assumed(name, options)
        taken[name] = Heading(labels[position], name, factor, unit)
        if unit and stated is None:
            notes.append(LENGTH_UNIT.row(labels[position], f"no unit; {unit} taken", **place.columns))
    used = {position for position, _ in positions.values()}
    unrecognized = tuple(label for i, label in enumerate(labels) if i not in used and row[i].strip())
    return Headings(labels, taken, unrecognized, together(notes))


def unread(headings: Headings, layout: Layout, place: Place, given: Collection[str] = ()) -> pd.DataFrame:
    """Return findings about the headings that were not read and about which `resolve` said nothing yet."""
    said = set(headings.findings["heading"].dropna())
    left = [label for label in headings.unrecognized if label not in said]
    return about_unread(left, headings.taken, layout, place, given)


def _positions(
    row: Sequence[str], means: Sequence[Reading | UnknownUnit | None], place: Place
) -> dict[str, tuple[int, Reading]]:
    positions: dict[str, tuple[int, Reading]] = {}
    for position, item in enumerate(means):
        if not isinstance(item, Reading):
            continue
        first = positions.setdefault(item.column, (position, item))[0]
        if first != position:
            both = (f"{row[i].strip()} (column {column_letters(i)})" for i in (first, position))
            remedy = f'rename one, or say which it is: columns = {{ {item.column} = "your heading" }}'
            raise InputError(problem(str(place), " and ".join(both), f"one heading for {item.column}", remedy))
    return positions


def _stated(item: Reading, label: str, beneath: str, place: Place) -> tuple[float, str] | None:
    """Return factor and unit that the heading or the units row beneath it states, or None."""
    column = schema.column(item.column)
    word = plain(beneath).strip("()[] ")
    below = None
    if word and column.unit and is_unit(word):
        below = stated_unit(column, word)
        if below is None:
            allowed = f"a unit of {column.name}: {units_in_words(column.unit)}"
            raise InputError(problem(f"{place}, units row under {label!r}", beneath, allowed, "correct the unit"))
    if item.factor is not None and below is not None and not _is_same_unit(column.unit, item, word, below):
        found = f"{item.unit} in the heading, {beneath.strip()} beneath"
        raise InputError(problem(f"{place}, {label!r}", found, "one unit", "correct the heading or the units row"))
    if item.factor is not None:
        return item.factor, item.unit
    return None if below is None else (below, word)


def _assumed(column: str, options: TableOptions) -> tuple[float, str]:
    """Return factor and unit of a heading of which the file states no unit."""
    if schema.column(column).unit != "m" or options.length_unit == "m":
        return 1.0, ""
    factor = unit_factor("m", options.length_unit)
    if factor is None or options.length_unit not in LENGTH_UNITS:
        allowed = ", ".join(LENGTH_UNITS)
        raise UsageError(problem("length_unit", options.length_unit, allowed, "choose one of these"))
    return factor, options.length_unit


def _is_same_unit(house_unit: str, item: Reading, word: str, below: float) -> bool:
    if house_unit == "crs":
        first, second = unit_factor("m", item.unit), unit_factor("m", word)
        return first is None or second is None or math.isclose(first, second, rel_tol=1e-12)
    return item.factor is not None and math.isclose(item.factor, below, rel_tol=1e-12)


def _notes(
    row: Sequence[str], labels: Sequence[str], means: Sequence[Reading | UnknownUnit | None], place: Place
) -> list[pd.DataFrame]:
    parts = []
    for cell, label, item in zip(row, labels, means, strict=True):
        if isinstance(item, UnknownUnit):
            parts.append(UNIT_NOT_KNOWN.row(label, item.unit, **place.columns))
        elif cell.strip() and cell != label:
            parts.append(REPEATED.row(label, cell, **place.columns))
        elif item is not None and item.column == FINES_COLUMN and is_percent_fines(cell):
            parts.append(FINES.row(label, cell, **place.columns))
        elif item is not None and item.column.startswith("passing_") and _SIEVE_NUMBER.fullmatch(key(cell)):
            parts.append(SIEVE_NUMBER.row(label, cell, **place.columns))
    return parts
