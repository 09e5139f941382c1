"""Conventions of writing that a whole file follows: the decimal comma, and sieves by name in a column of sizes.

Cells are rewritten only where the convention is beyond doubt; a finding says so, and the original is kept.
"""

from __future__ import annotations

import pandas as pd

from geomap.readers.sheets import Place
from geomap.readers.sieves import size_from_inches, size_from_text
from geomap.tables import schema
from geomap.tables.findings import Check, together
from geomap.tables.raw import Heading
from geomap.units import INCH_MM

# Delimiters beside which a comma can be a decimal sign. A pipe is left out: such files come from databases.
DECIMAL_COMMA_DELIMITERS = (";", "\t")

_COMMA = r"[<>≤≥]?=?\s*[+-]?(?:\d+\+)?\d+,\d+\s*%?"  # 12,5 and <0,5 and the chainage 12+345,6
_POINT = r"[<>≤≥]?=?\s*[+-]?(?:\d+\+)?\d*\.\d+\s*%?"
_THOUSANDS = r"[<>≤≥]?=?\s*[+-]?[1-9]\d{0,2},\d{3}\s*%?"  # 1,250 may be either
_SEVERAL_COMMAS = r"[+-]?\d{1,3}(?:,\d{3}){2,}"

DECIMAL_COMMA = Check(
    "decimal comma",
    "convert",
    "a decimal point",
    "commas in the number columns of this file were read as decimal signs",
)
COMMA_UNCLEAR = Check(
    "unclear comma", "query", "one sign for decimals in the whole file", "not changed: write decimals with a point"
)
SIEVE_NAME = Check("sieve by name", "convert", "a size in mm", "read as the size of that sieve in mm")


def with_decimal_points(cells: pd.DataFrame, delimiter: str, place: Place) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Return the cells with decimal points for decimal commas, and the findings about it.

    The comma is a decimal sign where no number of the file has a decimal point, none has two commas, and one at
    least cannot be thousands.

    Parameters
    ----------
    cells
        Text cells by column of geomap.
    delimiter
        Delimiter of the file.
    place
        File and sheet, for the finding.
    """
    nothing = pd.DataFrame()
    names = [name for name in cells.columns if name == "chainage" or schema.column(name).type in ("number", "integer")]
    if delimiter not in DECIMAL_COMMA_DELIMITERS or not names:
        return cells, nothing
    commas = {name: _matches(cells[name], _COMMA) for name in names}
    found = [str(cells.loc[mask, name].iloc[0]) for name, mask in commas.items() if mask.any()]
    if not found:
        return cells, nothing
    has_points = any(_matches(cells[name], _POINT).any() for name in names)
    has_several = any(_matches(cells[name], _SEVERAL_COMMAS).any() for name in names)
    is_sure = any((commas[name] & ~_matches(cells[name], _THOUSANDS)).any() for name in names)
    if has_points or has_several or not is_sure:
        return cells, COMMA_UNCLEAR.row("", ", ".join(found[:3]), **place.columns)
    changed = {
        name: cells[name].mask(mask, cells[name].str.replace(",", ".", regex=False))
        for name, mask in commas.items()
        if mask.any()
    }
    return cells.assign(**changed), DECIMAL_COMMA.row("", ", ".join(found[:3]), **place.columns)


def with_sizes_in_mm(cells: pd.Series, heading: Heading, place: Place) -> tuple[pd.Series, Heading, pd.DataFrame]:
    """Return a column of particle sizes as numbers in mm where it names sieves, its heading, and findings.

    ``No. 200``, ``#40`` and ``3/4 in`` are read by the table of sieves, and so is every cell of a column in inches:
    3/4 is the 19.0 mm sieve. A column of plain numbers in another unit is left to the factor of its heading.

    Parameters
    ----------
    cells
        Texts; the index is the row number.
    heading
        Heading of the column; its factor is 1 in what is returned where the cells were changed.
    place
        File and sheet, for findings.
    """
    in_inches = heading.factor == INCH_MM
    texts = cells.dropna().unique()
    sizes = {text: _size(text, in_inches) for text in texts}
    named = {text: size for text, size in sizes.items() if size is not None}
    if not named:
        return cells, heading, pd.DataFrame()
    plain = {text: number * heading.factor for text in texts if text not in named and (number := _number(text))}
    to_text = {text: f"{size:.6g}" for text, size in (plain | named).items()}
    notes = []
    for text in named:
        row = int(cells.index[(cells == text).fillna(False)][0])
        notes.append(SIEVE_NAME.row(heading.found, f"{text}: {to_text[text]} mm", **place.at(row).columns))
    changed = cells.map(to_text).astype("string").fillna(cells)
    return changed, Heading(heading.found, heading.column, 1.0, "mm"), together(notes)


def _size(text: str, in_inches: bool) -> float | None:
    size = size_from_text(text)
    return size_from_inches(text) if size is None and (in_inches or "/" in text) else size


def _number(text: str) -> float | None:
    try:
        return float(text)
    except ValueError:
        return None


def _matches(cells: pd.Series, pattern: str) -> pd.Series:
    return cells.str.fullmatch(pattern).fillna(False).astype(bool)
