"""Which row of a table holds its headings, what each cell of it means, and whether the row beneath states units."""

from __future__ import annotations

import difflib
import re
from collections.abc import Collection, Mapping, Sequence

from geomap.errors import UsageError, problem
from geomap.readers.headings import Reading, UnknownUnit, reading, reading_as
from geomap.readers.options import TableOptions
from geomap.readers.sheets import HEADING_SEARCH_ROWS, column_letters
from geomap.readers.sieves import FINES_MM, is_percent_fines, size_from_heading
from geomap.readers.spelling import is_unit, key, plain
from geomap.tables import schema
from geomap.tables.schema import Layout, passing_column

FINES_COLUMN = passing_column(FINES_MM)
MIN_LIKENESS = 0.6  # of difflib, for "did you mean"

# Words that stand in a units row over columns without a unit.
_NEUTRAL = re.compile(r"-|text|date|ratio|kg|mm/blow|blows?\b.*|n(?:o|umber)|[ymd]{1,4}[-/.][ymd]{1,3}[-/.][ymd]{1,4}")
_DEGREES = re.compile(r"°|deg(?:rees?)?|decimal degrees")


def unique_labels(row: Sequence[str]) -> tuple[str, ...]:
    """Return one label for each cell: a repeated one is numbered, a blank one is named by its letters.

    Examples
    --------
    >>> unique_labels(["Note", "", "Note"])
    ('Note', 'column B', 'Note (2)')
    """
    labels: list[str] = []
    taken: set[str] = set()
    for position, cell in enumerate(row):
        base = label = cell if cell.strip() else f"column {column_letters(position)}"
        count = 1
        while label in taken:
            count += 1
            label = f"{base} ({count})"
        labels.append(label)
        taken.add(label)
    return tuple(labels)


def mapping(layout: Layout, options: TableOptions, place: str) -> dict[str, str]:
    """Return the user's own headings by column of geomap.

    Raises
    ------
    UsageError
        A column is not one of the layout, or one heading is given for two columns.
    """
    found: dict[str, str] = {}
    for name, heading in options.columns.items():
        size = size_from_heading(name) if layout.takes_passing else None
        column = name if size is None else passing_column(size)
        if size is None and name not in layout.columns:
            near = difflib.get_close_matches(name, layout.columns, n=1, cutoff=MIN_LIKENESS)
            remedy = f"did you mean {near[0]}?" if near else "choose one of these"
            raise UsageError(problem(f"{place}: columns", name, ", ".join(layout.columns), remedy))
        if any(key(heading) == key(other) for other in found.values()):
            raise UsageError(problem(f"{place}: columns", heading, "each heading once", "keep one of the two"))
        found[column] = heading
    return found


def readings(row: Sequence[str], layout: Layout, mapped: Mapping[str, str]) -> list[Reading | UnknownUnit | None]:
    """Return what each cell of a row means as a heading; the user's own headings go first.

    Percent fines counts only where no other heading means percent passing 0.075 mm: many sheets have both.
    """
    by_heading = {key(heading): column for column, heading in mapped.items()}
    result: list[Reading | UnknownUnit | None] = []
    for cell in row:
        if not cell or cell.isspace():
            result.append(None)
        elif (column := by_heading.get(key(cell))) is not None:
            result.append(reading_as(cell, schema.column(column)))
        else:
            found = reading(cell, layout)
            result.append(None if found is not None and found.column in mapped else found)
    fines = [index for index, item in enumerate(result) if item is not None and item.column == FINES_COLUMN]
    if not all(is_percent_fines(row[index]) for index in fines):
        return [None if index in fines and is_percent_fines(row[index]) else item for index, item in enumerate(result)]
    return result


def fit(
    rows: Sequence[Sequence[str]], layout: Layout, options: TableOptions, given: Collection[str] = ()
) -> tuple[bool, int, int]:
    """Return how well the best row answers a layout: all required columns or not, how many columns, which row.

    Parameters
    ----------
    rows
        Rows from the top; the first `HEADING_SEARCH_ROWS` are looked at.
    given
        Columns that come from elsewhere, such as x and y from a geometry.
    """
    mapped = mapping(layout, options, "corridor file")
    best = (False, 0, 0)
    for index, row in enumerate(rows[:HEADING_SEARCH_ROWS]):
        means = {item.column for item in readings(row, layout, mapped) if isinstance(item, Reading)}
        is_whole = set(layout.required) <= means | set(given) and bool(means)
        score = (is_whole, len(means), index)
        best = score if score[:2] > best[:2] else best
    return best


def is_units_row(row: Sequence[str]) -> bool:
    """Return whether the cells of a row that are not blank are all units, one at least of length, share or force.

    Examples
    --------
    >>> is_units_row(["", "-", "ft", "(%)", ""]), is_units_row(["BH1", "", "2.0"]), is_units_row(["-", "-"])
    (True, False, False)
    """
    words = [plain(cell).strip("()[] ") for cell in row if cell.strip()]
    units = [is_unit(word) for word in words]
    neutral = [bool(_NEUTRAL.fullmatch(word) or _DEGREES.fullmatch(word)) for word in words]
    return any(units) and all(a or b for a, b in zip(units, neutral, strict=True))
