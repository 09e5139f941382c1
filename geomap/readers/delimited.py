"""Text tables of any delimiter and of the encodings that labs send, as sheets of text.

Rows are counted as records, as a spreadsheet shows them: a quoted cell with line breaks is one cell of one row.
"""

from __future__ import annotations

import csv
import io
import itertools
import re
from collections import Counter
from collections.abc import Callable, Sequence
from pathlib import Path

import pandas as pd

from geomap.errors import InputError, UsageError, problem
from geomap.readers.files import first_bytes, signature
from geomap.readers.sheets import HEADING_SEARCH_ROWS, Place, Sheet, check_width
from geomap.tables.findings import Check

SUFFIXES = (".csv", ".txt", ".tsv")
DELIMITERS = {"comma": ",", "semicolon": ";", "tab": "\t", "pipe": "|", "space": " "}
TRIED = (",", ";", "\t", "|")
TRIAL_BYTES = 1 << 16  # ours: what the delimiter is found from
TRIAL_COLUMNS = 1000

# Byte order marks, Unicode standard, section 23.8; the longer ones first.
_MARKS = (
    (b"\xff\xfe\x00\x00", "utf-32"),
    (b"\x00\x00\xfe\xff", "utf-32"),
    (b"\xef\xbb\xbf", "utf-8-sig"),
    (b"\xff\xfe", "utf-16"),
    (b"\xfe\xff", "utf-16"),
)
_CONTROL = re.compile(rb"[\x00-\x08\x0e-\x19\x1b-\x1f]")  # 0x1a ends some old text files
_STATED_DELIMITER = re.compile(r'"?sep=(.)"?')  # first line that spreadsheets write and obey

ENCODING = Check(
    "text encoding",
    "accept",
    "UTF-8",
    "read as Windows-1252; look at names with accents and save as UTF-8 if they are wrong",
)

Score = Callable[[Sequence[Sequence[str]]], tuple[int, ...]]


def read(path: Path, delimiter: str, score: Score) -> Sheet:
    """Return a text file as a sheet.

    Parameters
    ----------
    path
        The file.
    delimiter
        A character, or a key of `DELIMITERS`; blank: the one of `TRIED` whose rows have the best `score`.
    score
        How well some rows, read with one delimiter, answer the table that is wanted; greater is better.

    Raises
    ------
    InputError
        The file cannot be opened, is no text, has no cell, is quoted wrongly or is too wide.
    UsageError
        The delimiter is not one character.
    """
    start = first_bytes(path)
    data = path.read_bytes()
    encoding = _encoding(data, start, path.name)
    delimiter = _named_delimiter(delimiter, path.name) or _found_delimiter(data, encoding, score)
    rows = _records(data, encoding, delimiter, path.name)
    if not any(cell.strip() for row in rows for cell in row):
        raise InputError(problem(path.name, "no filled cell", "a table", "save it again from where it came"))
    check_width(max(len(row) for row in rows), path.name)
    is_assumed = encoding in ("cp1252", "latin-1")
    notes = ENCODING.row("", "not UTF-8", **Place(path.name).columns) if is_assumed else pd.DataFrame()
    return Sheet(path.name, "", rows, delimiter, notes)


def _encoding(data: bytes, start: bytes, file: str) -> str:
    """Return the encoding of a text, or raise where the bytes are no text."""
    for mark, encoding in _MARKS:
        if data.startswith(mark):
            _check_decodes(data, encoding, file)
            return encoding
    what = signature(start)
    if what:
        raise InputError(problem(file, what, "a text table", "give the file its right ending, or export a text table"))
    control = _CONTROL.search(data)
    if control:
        found = (
            f"a byte {control.group()[0]:#04x} at {control.start()}, as in binary files and in UTF-16 without its mark"
        )
        raise InputError(problem(file, found, "text", "save it as CSV in UTF-8"))
    for encoding in ("utf-8", "cp1252"):
        try:
            data.decode(encoding)
        except UnicodeDecodeError:
            continue
        return encoding
    return "latin-1"


def _check_decodes(data: bytes, encoding: str, file: str) -> None:
    try:
        text = data.decode(encoding)
    except UnicodeDecodeError as error:
        found = f"bytes that are not {encoding.upper()} at {error.start}, though the file begins with its mark"
        raise InputError(problem(file, found, "text", "save it again as CSV in UTF-8")) from None
    if "\0" in text:
        raise InputError(problem(file, "null characters", "text", "save it again as CSV in UTF-8"))


def _named_delimiter(delimiter: str, file: str) -> str:
    found = DELIMITERS.get(delimiter, delimiter)
    if len(found) > 1 or found in ('"', "\r", "\n"):
        allowed = "one character, or " + ", ".join(DELIMITERS)
        raise UsageError(problem(f"{file}: delimiter", delimiter, allowed, "name the delimiter of the file"))
    return found


def _found_delimiter(data: bytes, encoding: str, score: Score) -> str:
    """Return the delimiter that reads the head of the text best: by its headings, else by rows of even length."""
    head = data[:TRIAL_BYTES].decode(encoding, "ignore")
    first = head.splitlines()[0].strip() if head.strip() else ""
    stated = _STATED_DELIMITER.fullmatch(first)
    if stated:
        return stated.group(1)

    def quality(delimiter: str) -> tuple[int, ...]:
        reader = csv.reader(io.StringIO(head, newline=""), delimiter=delimiter)
        rows = [row[:TRIAL_COLUMNS] for row in itertools.islice(reader, HEADING_SEARCH_ROWS)]
        widths = Counter(len(row) for row in rows if len(row) > 1)
        return (*score(rows), widths.most_common(1)[0][1] if widths else 0)

    try:
        return max(TRIED, key=quality)
    except csv.Error:  # a cell beyond all measure; `_records` says where
        return TRIED[0]


def _records(data: bytes, encoding: str, delimiter: str, file: str) -> list[list[str]]:
    rows: list[list[str]] = []
    data = data.removesuffix(b"\x1a")
    try:
        with io.TextIOWrapper(io.BytesIO(data), encoding=encoding, newline="") as text:
            rows.extend(csv.reader(text, delimiter=delimiter, strict=True))
    except csv.Error as error:
        # list.extend keeps what came before the error: its length is the number of good rows.
        allowed = "a quoted cell that ends with a quote, with quotes inside doubled"
        remedy = f"correct the quotes in this row ({error})"
        raise InputError(problem(f"{file}, row {len(rows) + 1}", "a quote out of place", allowed, remedy)) from None
    return rows
