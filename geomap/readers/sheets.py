"""A sheet: rows of text cells as a spreadsheet shows them, before any heading is known."""

from __future__ import annotations

import difflib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace

import pandas as pd

from geomap.errors import InputError, UsageError, problem
from geomap.tables.schema import Layout

HEADING_SEARCH_ROWS = 30  # ours: a title block above the headings is rarely longer
MAX_COLUMNS = 10_000  # ours; a wide lab table has some tens
MAX_CELLS = 50_000_000  # ours: rows times columns of a sheet, blank ones too
MAX_ROWS = 1_048_576  # rows of an XLSX sheet, ECMA-376; more are not written by any spreadsheet


@dataclass(frozen=True)
class Sheet:
    """Rows of one text file or of one sheet of a workbook; ``rows[0]`` is row 1.

    Attributes
    ----------
    file, name
        Name of the file (no folder) and of the sheet; blank for a text file.
    rows
        Cells as text, as found; rows may differ in length.
    delimiter
        Delimiter of a text file; blank for a workbook.
    findings
        What was noticed while the file was opened.
    """

    file: str
    name: str
    rows: Sequence[Sequence[str]]
    delimiter: str = ""
    findings: pd.DataFrame = field(default_factory=pd.DataFrame)

    def place(self, index: int | None = None) -> Place:
        """Return where the sheet, or the row at `index` of `rows`, stands."""
        return Place(self.file, self.name, None if index is None else index + 1)


@dataclass(frozen=True)
class Place:
    """Where something stands, for messages (as text) and findings (as columns)."""

    file: str
    sheet: str = ""
    row_number: int | None = None

    def __str__(self) -> str:
        """Return file, sheet and row in words."""
        sheet = f", sheet {self.sheet}" if self.sheet else ""
        return self.file + sheet + (f", row {self.row_number}" if self.row_number else "")

    def at(self, row_number: int) -> Place:
        """Return a row of the same file and sheet."""
        return replace(self, row_number=row_number)

    @property
    def columns(self) -> dict[str, object]:
        """The same as columns of a finding."""
        named: dict[str, object] = {"file": self.file, "sheet": self.sheet}
        return named if self.row_number is None else {**named, "row_number": self.row_number}


def column_letters(position: int) -> str:
    """Return the letters over a column in a spreadsheet, for a position counted from 0.

    Examples
    --------
    >>> column_letters(0), column_letters(25), column_letters(26), column_letters(701), column_letters(702)
    ('A', 'Z', 'AA', 'ZZ', 'AAA')
    """
    letters = ""
    number = position + 1
    while number:
        number, rest = divmod(number - 1, 26)
        letters = chr(ord("A") + rest) + letters
    return letters


def filled(row: Sequence[str]) -> int:
    """Return how many cells a row has up to its last one that is not blank.

    Examples
    --------
    >>> filled(["BH1", "", "2", " ", ""]), filled(["", ""])
    (3, 0)
    """
    count = len(row)
    while count and not row[count - 1].strip():
        count -= 1
    return count


def check_width(count: int, place: object) -> None:
    """Raise where a row has more cells than any table of this trade.

    Raises
    ------
    InputError
        There are more than `MAX_COLUMNS` columns.
    """
    if count > MAX_COLUMNS:
        remedy = "keep the columns of the table and delete the rest"
        raise InputError(problem(str(place), f"{count} columns", f"at most {MAX_COLUMNS}", remedy))


def chosen_part(
    kind: str, file: str, titles: Sequence[str], wanted: str, fits: Mapping[str, tuple[int, ...]], layout: Layout
) -> str:
    """Return which sheet or layer of a file is meant.

    Parameters
    ----------
    kind, file
        ``"sheet"`` or ``"layer"``, and the name of the file, for messages.
    titles
        All there are.
    wanted
        The name that the user gives; blank: the only one, or the only one that fits. Where several fit, the one
        that has the name of the layout.
    fits
        For each title how well it answers the table; first number 1 if wholly. Empty where there is no choice.
    layout
        The table that is wanted.

    Raises
    ------
    UsageError
        There is none of the name wanted.
    InputError
        None, or several, fit.
    """
    listed = ", ".join(titles) or "none"
    if wanted:
        same = [title for title in titles if title.strip().casefold() == wanted.strip().casefold()]
        if wanted in titles or len(same) == 1:
            return wanted if wanted in titles else same[0]
        near = difflib.get_close_matches(wanted, titles, n=1, cutoff=0.6)
        remedy = f"did you mean {near[0]}?" if near else "choose one of these"
        raise UsageError(problem(f"{file}: {kind}", wanted, listed, remedy))
    if not titles:
        raise InputError(problem(file, f"no {kind} with a table", f"one {kind} at least", "save it again"))
    if len(titles) == 1:
        return titles[0]
    fitting = [title for title in titles if fits[title][0]]
    named = [title for title in fitting if title.strip().casefold() == layout.name]
    if len(fitting) == 1 or named:
        return named[0] if named else fitting[0]
    raise InputError(_open_choice(kind, file, titles, fitting, layout, max(titles, key=lambda title: fits[title])))


def _open_choice(
    kind: str, file: str, titles: Sequence[str], fitting: Sequence[str], layout: Layout, nearest: str
) -> str:
    required = ", ".join(layout.required)
    if fitting:
        found, remedy = f"{len(fitting)} {kind}s that may be meant", f'name one: {kind} = "{fitting[0]}"'
    else:
        found = f"no {kind} with the headings of {layout.title.lower()}"
        remedy = f'{nearest} comes nearest: name it to see what it lacks ({kind} = "{nearest}")'
    return problem(file, found, f"one of {', '.join(fitting or titles)} with {required}", remedy)
