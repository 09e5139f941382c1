"""XLSX workbooks: one sheet as text, as the spreadsheet shows it.

Numbers lose the noise of their binary form, dates become year-month-day (also where a number belongs: that is for
intake to see), percentages keep their sign, failed formulas keep their mark.
"""

from __future__ import annotations

import itertools
import re
import warnings
import zipfile
import zlib
from collections.abc import Callable, Iterator, Sequence
from contextlib import closing
from functools import lru_cache
from pathlib import Path
from typing import Any

import pandas as pd

from geomap.errors import InputError, problem
from geomap.readers.cell_text import text_from_value
from geomap.readers.files import first_bytes, reason, signature
from geomap.readers.sheets import HEADING_SEARCH_ROWS, MAX_CELLS, MAX_ROWS, Sheet, check_width, chosen_part, filled
from geomap.tables.findings import Check
from geomap.tables.schema import Layout

SUFFIXES = (".xlsx", ".xlsm")
MAX_UNPACKED_BYTES = 1 << 29  # ours: 512 MiB; a sheet of 1,000,000 filled cells unpacks to about 50 MiB
MAX_PARTS = 10_000  # ours: files in the archive

_ZIP = b"PK\x03\x04"
_FORMULA = re.compile(rb"<(?:\w{1,30}:)?f[ >/]")

NOT_CALCULATED = Check(
    "formula without a value",
    "query",
    "formulas with their values",
    "the formula stands in place of its value: open the workbook in a spreadsheet and save it",
)

Fit = Callable[[Sequence[Sequence[str]]], tuple[int, ...]]


def read(path: Path, sheet: str, layout: Layout, fit: Fit) -> Sheet:
    """Return one sheet of a workbook.

    Parameters
    ----------
    path
        The file.
    sheet
        Name of the sheet; blank: the only one, or the only one that fits.
    layout
        The table that is wanted; of several sheets that fit, the one of its name is taken.
    fit
        How well the first rows of a sheet answer it; first number 1 if wholly.

    Raises
    ------
    InputError
        The file is no workbook, is damaged or too large, or it is open which sheet is meant.
    UsageError
        There is no sheet of that name.
    """
    check_archive(path)
    with closing(_opened(path)) as book:
        titles = [item.title for item in book.worksheets]
        fits = {}
        if not sheet and len(titles) > 1:
            fits = {item.title: fit(_texts(item, path, HEADING_SEARCH_ROWS)) for item in book.worksheets}
        title = chosen_part("sheet", path.name, titles, sheet, fits, layout)
        rows = _texts(book[title], path)
    place = Sheet(path.name, title, rows).place()
    if not any(rows):
        raise InputError(problem(str(place), "no filled cell", "a table", "name the sheet that holds it"))
    notes = _with_formulas(path, title, rows) if _has_formulas(path) else pd.DataFrame()
    return Sheet(path.name, title, rows, findings=notes)


def check_archive(path: Path) -> None:
    """Raise where a file is not a workbook, or unpacks to more than a workbook of this trade would.

    Raises
    ------
    InputError
        With what the file is instead, or how large it is.
    """
    start = first_bytes(path)
    if not start.startswith(_ZIP):
        what = signature(start) or "something else"
        remedy = "open it in a spreadsheet and save it as XLSX without a password"
        raise InputError(problem(path.name, what, "an XLSX workbook", remedy))
    try:
        with zipfile.ZipFile(path) as archive:
            parts = archive.infolist()
    except (zipfile.BadZipFile, OSError, ValueError) as error:
        raise InputError(_damaged(path, error)) from None
    size = sum(part.file_size for part in parts)
    if size > MAX_UNPACKED_BYTES or len(parts) > MAX_PARTS:
        allowed = f"at most {MAX_UNPACKED_BYTES >> 20} MiB in {MAX_PARTS} parts"
        found = f"{size >> 20} MiB in {len(parts)} parts when unpacked"
        raise InputError(problem(path.name, found, allowed, "keep the sheet of the table only, or save it as CSV"))


def _damaged(path: Path, error: BaseException) -> str:
    remedy = f"copy it again, or open it in a spreadsheet and save it ({reason(error, path)})"
    return problem(path.name, "a damaged file", "an XLSX workbook", remedy)


def _opened(path: Path, values: bool = True) -> Any:
    """Return a workbook opened to be read row by row, with values or with formulas."""
    import openpyxl

    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore")  # parts that openpyxl does not read: styles, drawings, validation
            return openpyxl.load_workbook(path, read_only=True, data_only=values, keep_links=False)
    except MemoryError:
        raise
    except Exception as error:  # damaged XML surfaces as errors of a dozen kinds
        raise InputError(_damaged(path, error)) from None


def _cells(sheet: Any, path: Path) -> Iterator[Sequence[Any]]:
    """Yield the rows of a sheet as cells, and stop where it is damaged or has more than any spreadsheet."""
    place = f"{path.name}, sheet {sheet.title}"
    sheet.reset_dimensions()  # some programs write a wrong size; the cells themselves are right
    rows = sheet.iter_rows()
    count = 0
    for number in itertools.count(1):
        try:
            with warnings.catch_warnings():
                warnings.simplefilter("ignore")  # a date out of range: the cell shows #VALUE!
                row = next(rows, None)
        except MemoryError:
            raise
        except Exception as error:  # as in `_opened`
            raise InputError(_damaged(path, error)) from None
        if row is None:
            return
        check_width(len(row), place)
        count += len(row)
        if number > MAX_ROWS or count > MAX_CELLS:
            allowed = f"at most {MAX_ROWS} rows and {MAX_CELLS} cells"
            remedy = "delete the empty rows and columns that only carry a format"
            raise InputError(problem(place, f"row {number}, {count} cells", allowed, remedy))
        yield row


def _texts(sheet: Any, path: Path, count: int | None = None) -> list[list[str]]:
    """Return the first rows of a sheet, or all, as text, without the blank cells at their ends."""
    result = []
    for row in itertools.islice(_cells(sheet, path), count):
        texts = [_text(cell) for cell in row]
        result.append(texts[: filled(texts)])
    return result


def _text(cell: Any) -> str:
    value = cell.value
    if isinstance(value, float | int) and not isinstance(value, bool):
        return text_from_value(value, is_percent=is_percent_format(_number_format(cell)))
    return text_from_value(value)


def _number_format(cell: Any) -> str:
    try:
        return str(cell.number_format)
    except LookupError:  # a style that the workbook does not hold
        return "General"


@lru_cache(maxsize=1024)
def is_percent_format(number_format: str) -> bool:
    r"""Return whether a number format shows a hundred times the number; a quoted percent sign does not.

    Examples
    --------
    >>> is_percent_format("0.0%"), is_percent_format('0.0"%"'), is_percent_format(r"0.0\%")
    (True, False, False)
    """
    return "%" in re.sub(r'"[^"]*"|\\.', "", number_format)


def _has_formulas(path: Path) -> bool:
    """Return whether any sheet holds a formula, by its XML; most lab tables hold none."""
    try:
        with zipfile.ZipFile(path) as archive:
            sheets = [part for part in archive.namelist() if part.startswith("xl/worksheets/")]
            return any(_FORMULA.search(block) for part in sheets for block in _blocks(archive, part))
    except (zipfile.BadZipFile, zlib.error, OSError, RuntimeError) as error:
        raise InputError(_damaged(path, error)) from None


def _blocks(archive: zipfile.ZipFile, part: str) -> Iterator[bytes]:
    tail = b""
    with archive.open(part) as stream:
        while block := stream.read(1 << 20):
            yield tail + block
            tail = block[-40:]  # longer than the mark that is searched


def _with_formulas(path: Path, title: str, rows: list[list[str]]) -> pd.DataFrame:
    """Put the formula into each cell whose value was never calculated: a blank there would pass for not tested."""
    changed = []
    with closing(_opened(path)) as valued, closing(_opened(path, values=False)) as written:
        both = zip(_cells(valued[title], path), _cells(written[title], path), strict=True)
        for index, cells in enumerate(both):
            for position, (value, formula) in enumerate(zip(*cells, strict=True)):
                # A formula whose value is the blank text has a value: its type says so.
                if formula.data_type != "f" or value.value is not None or value.data_type == "str":
                    continue
                row = rows[index]
                row.extend([""] * (position + 1 - len(row)))
                row[position] = str(getattr(formula.value, "text", formula.value))
                changed.append(index)
    if not changed:
        return pd.DataFrame()
    place = Sheet(path.name, title, rows).place(changed[0])
    found = f"{len(changed)} formulas without a value, the first in this row"
    return NOT_CALCULATED.row("", found, **place.columns)
