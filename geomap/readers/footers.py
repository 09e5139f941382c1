"""Footers beneath a table: "Tested by: ...", "NP = nonplastic". They are no rows of it."""

from __future__ import annotations

import itertools
import re
from collections.abc import Sequence

from geomap.readers.heading_groups import is_number
from geomap.readers.sheets import filled
from geomap.tables import schema
from geomap.tables.findings import Check
from geomap.tables.schema import Layout

WIDEST = 2  # ours: a footer is in the first cell of its row, or has its label there and its text in the next

FOOTER = Check("footer", "accept", "rows of the table", "left out, as text beneath the table and no row of it")


def footer_rows(rows: Sequence[Sequence[str]], used: Sequence[int], layout: Layout) -> list[int]:
    """Return which of the last rows in use are footers.

    After the table stands a blank row; from there on every row has text in its first cells only and no number, so
    that it lacks a number that the table requires. A row whose first cell is written like those of the table, as the
    name of a boring is, stays: it is for intake to ask what it lacks.

    Parameters
    ----------
    rows
        All rows of a sheet.
    used
        Positions of the rows beneath the headings that are not blank, in order.
    layout
        Which table it is; one that requires no number has no footers.

    Examples
    --------
    >>> rows = [["BH1", "1.5"], ["BH2", "2"], [""], ["Tested by:", "J. D."], ["BH3", ""], [""], ["NP = nonplastic"]]
    >>> footer_rows(rows, [0, 1, 3, 4, 6], schema.inputs()["samples"])
    [6]
    """
    if not any(schema.column(name).type == "number" for name in layout.required):
        return []
    tail = list(itertools.takewhile(lambda index: _is_footer(rows[index]), reversed(used)))
    if not tail or len(tail) == len(used):
        return []
    shapes = {_shape(name) for name in {_first(rows[index]) for index in used[: -len(tail)]}}
    tail = list(itertools.takewhile(lambda index: _shape(_first(rows[index])) not in shapes, tail))
    known = set(used)
    after_blank = [k for k, index in enumerate(tail) if index - 1 not in known]
    return tail[after_blank[-1] :: -1] if after_blank else []


def _is_footer(row: Sequence[str]) -> bool:
    return filled(row) <= WIDEST and not any(is_number(cell) for cell in row[:WIDEST])


def _first(row: Sequence[str]) -> str:
    return next((cell.strip() for cell in row if cell.strip()), "")


def _shape(text: str) -> str:
    """Return a text with every run of letters as a and of digits as 0."""
    return re.sub(r"\d+", "0", re.sub(r"[^\W\d_]+", "a", text))
