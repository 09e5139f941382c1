"""What to tell the user when headings do not answer a layout."""

from __future__ import annotations

import difflib
from collections.abc import Mapping, Sequence

from geomap.errors import UsageError, problem
from geomap.readers.heading_rows import MIN_LIKENESS
from geomap.readers.headings import Reading, UnknownUnit, spellings
from geomap.readers.spelling import key
from geomap.tables import schema
from geomap.tables.schema import Layout
from geomap.units import SPELLINGS

SHOWN_HEADINGS = 30  # ours: as many found headings as a message can show
SHOWN_ALIASES = 6


def check_mapped(row: Sequence[str], mapped: Mapping[str, str], place: str) -> None:
    """Raise where a heading of the user's own is not in the row.

    Raises
    ------
    UsageError
        Names the heading and the nearest one of the file.
    """
    there = {key(cell): cell for cell in row if cell.strip()}
    for column, heading in mapped.items():
        if key(heading) not in there:
            near = difflib.get_close_matches(heading, list(there.values()), n=1, cutoff=MIN_LIKENESS)
            remedy = f"did you mean {near[0]!r}?" if near else "write a heading of the file"
            raise UsageError(problem(f"{place}: columns.{column}", heading, listed(row), remedy))


def listed(row: Sequence[str]) -> str:
    """Return the headings of a row in words."""
    shown = [repr(" ".join(cell.split())[:40]) for cell in row if cell.strip()]
    more = f" and {len(shown) - SHOWN_HEADINGS} more" if len(shown) > SHOWN_HEADINGS else ""
    return ", ".join(shown[:SHOWN_HEADINGS]) + more if shown else "none"


def units_in_words(house_unit: str) -> str:
    """Return the spellings of a unit in words."""
    return ", ".join(SPELLINGS.get(house_unit, {"no unit": 1.0}))


def missing_text(
    row: Sequence[str],
    layout: Layout,
    missing: Sequence[str],
    means: Sequence[Reading | UnknownUnit | None],
    place: str,
) -> str:
    """Return the message for required headings that no cell answers, or where none at all is known."""
    if not missing:
        known = ", ".join(layout.columns)
        return f"{place}: found the headings {listed(row)}; allowed: one at least of {known}; rename the headings"
    names = spellings(layout)
    wanted = "; ".join(f"{name} (or {', '.join(names[name][1 : 1 + SHOWN_ALIASES])})" for name in missing)
    hints = [
        f"the unit in {cell.strip()!r} is not one of {item.column}: {units_in_words(schema.column(item.column).unit)}"
        for cell, item in zip(row, means, strict=True)
        if isinstance(item, UnknownUnit) and item.column in missing
    ]
    free = {key(cell): cell.strip() for cell, item in zip(row, means, strict=True) if cell.strip() and item is None}
    for name in missing:
        near = [m for s in names[name] for m in difflib.get_close_matches(key(s), free, n=1, cutoff=MIN_LIKENESS)]
        hints += [f"did you mean {free[near[0]]!r} for {name}?"] if near else []
    hints.append(f'rename a heading, or say which it is: columns = {{ {missing[0]} = "your heading" }}')
    return (
        f"{place}: found the headings {listed(row)}; required for {layout.title.lower()}: "
        f"{', '.join(layout.required)}; missing: {wanted}; {'; '.join(hints)}"
    )
