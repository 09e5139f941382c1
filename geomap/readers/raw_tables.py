"""From rows or columns of text to a `RawTable`: what all table formats have in common."""

from __future__ import annotations

from collections.abc import Callable, Collection, Sequence
from dataclasses import replace
from pathlib import Path

import numpy as np
import pandas as pd

from geomap.errors import InputError, problem
from geomap.readers import delimited, workbooks
from geomap.readers.cell_conventions import with_decimal_points, with_sizes_in_mm
from geomap.readers.footers import FOOTER, footer_rows
from geomap.readers.heading_groups import HeadingRow, check_no_second_row, heading_row
from geomap.readers.heading_rows import is_units_row
from geomap.readers.options import TableOptions
from geomap.readers.sheets import Place, Sheet, filled
from geomap.readers.table_headings import UNITS_ROW, Headings, resolve, unread
from geomap.tables import schema
from geomap.tables.findings import Check, together
from geomap.tables.raw import RawTable
from geomap.tables.schema import Layout

ROW_INDEX = "row_number"
SHOWN_ROWS = 5  # row numbers that a message shows

HEADING_ROW = Check("rows above the headings", "accept", "headings in row 1", "these rows were not read")

TWO_ROWS = Check(
    "headings in two rows",
    "accept",
    "headings in one row",
    "this row was joined with the one beneath; see that each column is taken for what it is",
)


def from_delimited(path: Path, layout: str, options: TableOptions) -> RawTable:
    """Return the table of a text file."""
    wanted = schema.inputs()[layout]
    return from_sheet(delimited.read(path, options.delimiter, _score(wanted, options)), wanted, options)


def from_workbook(path: Path, layout: str, options: TableOptions) -> RawTable:
    """Return the table of one sheet of a workbook."""
    wanted = schema.inputs()[layout]
    return from_sheet(workbooks.read(path, options.sheet, wanted, _score(wanted, options)), wanted, options)


def _score(layout: Layout, options: TableOptions) -> Callable[[Sequence[Sequence[str]]], tuple[int, ...]]:
    def score(rows: Sequence[Sequence[str]]) -> tuple[int, ...]:
        found = heading_row(rows, layout, options)
        return int(found.is_whole), found.count

    return score


def from_sheet(sheet: Sheet, layout: Layout, options: TableOptions) -> RawTable:
    """Return the table of a sheet: its heading row is searched, rows above it and blank rows are left out.

    Raises
    ------
    InputError
        A required heading is missing, headings contradict each other, or a row of a text file has more cells than
        there are headings.
    """
    where = heading_row(sheet.rows, layout, options)
    if not where.count:  # nothing answers: the first filled row is shown as what was found
        top = next(index for index, row in enumerate(sheet.rows) if filled(row))
        where = HeadingRow(list(sheet.rows[top]), top, top, is_whole=False, count=0)
    top = where.last
    beneath = sheet.rows[top + 1] if len(sheet.rows) > top + 1 else []
    units = beneath if is_units_row(beneath) else []
    start = top + 1 + bool(units)
    widths = [filled(row) for row in sheet.rows[start:]]
    used = [index for index, width in enumerate(widths, start) if width]
    footers = footer_rows(sheet.rows, used, layout)
    used = used[: len(used) - len(footers)]
    row = list(where.cells)
    if not sheet.delimiter:  # in a workbook notes may stand beside the table
        row += [""] * (max(widths, default=0) - len(row))
    headings = resolve(row, layout, options, sheet.place(top), units)
    check_no_second_row(sheet.rows, where, layout, options, sheet.place(top + 1))
    _check_lengths(sheet, len(row), start, widths)
    notes = [sheet.findings, headings.findings, *_about_rows(sheet, where, units, footers)]
    filled_rows = [_of_length(sheet.rows[index], len(row)) for index in used]
    original = pd.DataFrame(filled_rows, columns=pd.Index(headings.labels, dtype=object), dtype=object).astype("string")
    original.index = pd.Index(np.array(used, dtype=np.int64) + 1, name=ROW_INDEX)
    nameless = {label for label, cell in zip(headings.labels, row, strict=True) if not cell.strip()}
    empty = {label for label in nameless if not original[label].str.strip().astype(bool).any()}
    original = original.loc[:, [label not in empty for label in headings.labels]]
    left = tuple(x for x in headings.labels if x in headings.unrecognized or x in nameless - empty)
    headings = replace(headings, unrecognized=left)
    notes.append(unread(headings, layout, sheet.place(top)))
    table = raw_table(original, layout, headings, sheet.place(), notes)
    return with_conventions(table, sheet.delimiter)


def _check_lengths(sheet: Sheet, most: int, start: int, widths: Sequence[int]) -> None:
    """Raise where a row is longer than the heading row: a delimiter too many puts cells under wrong headings."""
    places = [str(index + 1) for index, width in enumerate(widths, start) if width > most]
    if places:
        more = f" and {len(places) - SHOWN_ROWS} more" if len(places) > SHOWN_ROWS else ""
        found = f"up to {max(widths)} cells in row {', '.join(places[:SHOWN_ROWS])}{more}"
        remedy = "put cells that hold the delimiter in double quotes"
        raise InputError(problem(str(sheet.place()), found, f"at most {most}, as there are headings", remedy))


def _of_length(row: Sequence[str], length: int) -> Sequence[str]:
    return row if len(row) == length else [*row[:length], *[""] * (length - len(row))]


def _about_rows(sheet: Sheet, where: HeadingRow, units: Sequence[str], footers: Sequence[int]) -> list[pd.DataFrame]:
    """Return findings about rows that are no rows of the table, and about headings in two rows."""
    notes = []
    above = [index for index in range(where.first) if filled(sheet.rows[index])]
    if above:
        cells = [cell.strip() for cell in sheet.rows[above[0]] if cell.strip()]
        notes.append(HEADING_ROW.row("", "; ".join(cells), **sheet.place(above[0]).columns))
    if where.first < where.last:
        found = "; ".join(" ".join(cell.split()) for cell in sheet.rows[where.first] if cell.strip())
        notes.append(TWO_ROWS.row("", found, **sheet.place(where.first).columns))
    if units:
        found = ", ".join(cell.strip() for cell in units if cell.strip())
        notes.append(UNITS_ROW.row("", found, **sheet.place(where.last + 1).columns))
    if footers:
        lines = [" ".join(cell.strip() for cell in sheet.rows[index] if cell.strip()) for index in footers]
        notes.append(FOOTER.row("", "; ".join(lines), **sheet.place(footers[0]).columns))
    return notes


def raw_table(
    original: pd.DataFrame,
    layout: Layout,
    headings: Headings,
    place: Place,
    notes: Collection[pd.DataFrame] = (),
    crs: str = "",
) -> RawTable:
    """Return a table made of the columns of a file.

    Parameters
    ----------
    original
        Every column as text, named by the labels of `headings`; the index is the row number.
    layout, headings
        Which table it is, and what its columns were taken for.
    place
        File, and sheet or layer.
    notes
        Findings so far.
    crs
        Coordinate system that the file states, or blank.
    """
    stripped = {name: original[heading.found].str.strip() for name, heading in headings.taken.items()}
    cells = pd.DataFrame({name: column.mask(column == "") for name, column in stripped.items()}, index=original.index)
    return RawTable(
        layout=layout.name,
        file=place.file,
        sheet=place.sheet,
        cells=cells.astype("string"),
        headings=headings.taken,
        original=original,
        unrecognized=headings.unrecognized,
        crs=crs,
        findings=together(notes),
    )


def with_conventions(table: RawTable, delimiter: str) -> RawTable:
    """Return the table with decimal points for decimal commas, and particle sizes for names of sieves."""
    place = Place(table.file, table.sheet)
    cells, about_commas = with_decimal_points(table.cells, delimiter, place)
    headings, about_sizes = dict(table.headings), pd.DataFrame()
    if "size_mm" in headings:
        sizes, headings["size_mm"], about_sizes = with_sizes_in_mm(cells["size_mm"], headings["size_mm"], place)
        cells = cells.assign(size_mm=sizes)
    notes = together([table.findings, about_commas, about_sizes])
    return replace(table, cells=cells, headings=headings, findings=notes)
