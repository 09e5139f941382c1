"""Intake of values: from cells of text to typed columns, each entry accepted, queried or rejected.

A rejected entry becomes missing; its text stays in the cells and in the finding. The factor of the heading is
applied once, before the range of the column is checked.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Iterable

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.intake import damage, numbers, words
from geomap.intake.entries import USED, Entries, Flags, Intake, Texts
from geomap.intake.gathering import gathered
from geomap.tables import schema
from geomap.tables.findings import Check
from geomap.tables.raw import Heading, RawTable
from geomap.tables.schema import Column

EXTRA_COLUMNS = (*schema.SOURCE_COLUMNS, "status", "reason")
_UNIT_WORDS = {"pct": "%", "kg_m3": "kg/m3", "kpa": "kPa", "mg_kg": "mg/kg", "ohm_cm": "ohm-cm", "mv": "mV"}

CONVERTED = Check("unit of the heading", "convert", "", "each value was multiplied by {factor:.9g} to {unit}")
OUT_OF_RANGE = Check("out of range", "reject", "", "check the entry and the unit of its heading")
NEGATIVE_DEPTH = Check(
    "negative depth", "reject", "", "depth counts down from ground level and is positive; give the depth, not a level"
)
NOT_WHOLE = Check("not a whole number", "reject", "", "write a whole number")
LOST_ZEROS = Check(
    "zeros may be lost",
    "query",
    "names of one length",
    "other names in this column begin with 0; if a spreadsheet has dropped zeros, restore them",
)


def accept(tables: Iterable[RawTable]) -> Intake:
    """Return typed tables made of the cells that readers found.

    Parameters
    ----------
    tables
        Tables of any layouts. Several of one layout, from several sheets or files, become one table in the order
        given.

    Returns
    -------
    Intake
        For each layout its columns with ``file, sheet, row_number, status, reason``; ``<column>_bound`` where values
        are given as less or more than a number; ``is_nonplastic`` true where NP is written. The findings begin
        with those of the readers.
    """
    taken: dict[str, Entries] = {}
    parts = []
    for raw in tables:
        entries, found = _accept_one(raw)
        before = taken.get(raw.layout)
        taken[raw.layout] = entries if before is None else _one_after_other(before, entries)
        parts += [raw.findings, found]
    return Intake(taken, tuple(part for part in parts if len(part)))


def _accept_one(raw: RawTable) -> tuple[Entries, pd.DataFrame]:
    layout = schema.inputs()[raw.layout]
    cells = raw.cells.astype("string").reset_index(drop=True)
    place = pd.DataFrame(
        {
            "file": raw.file,
            "sheet": raw.sheet,
            "row_number": raw.cells.index.to_numpy(),
            "status": USED,
        },
        index=cells.index,
    )
    typed: dict[str, object] = {}
    nonplastic = np.zeros(len(cells), dtype=bool)
    judged = []
    for name in cells.columns:
        column, heading = schema.column(name), raw.headings.get(name, Heading(name, name))
        if column.type in ("number", "integer"):
            read = numbers.read(cells[name], column, heading.factor)
            typed |= _number_columns(read, column, heading)
            nonplastic |= (read["kind"] == "np").to_numpy(dtype=bool)
        else:
            read = words.read(cells[name], column)
            typed[name] = pd.Series(read["value"], dtype=column.dtype)
        judged.append((column, heading, read))
    if nonplastic.any():
        flag = pd.Series(typed.get("is_nonplastic", pd.NA), cells.index, dtype="boolean")
        typed["is_nonplastic"] = flag.mask(nonplastic, True)
    frame = pd.concat([pd.DataFrame(typed, index=cells.index), place], axis=1)
    rows = schema.conform(frame, layout, extra=EXTRA_COLUMNS)
    parts = [
        part for column, heading, read in judged for part in _findings(rows, cells[column.name], read, column, heading)
    ]
    source = {(raw.file, raw.sheet): {name: h.found for name, h in raw.headings.items()}}
    return Entries(raw.layout, rows, cells, source), gathered(parts)


def _number_columns(read: pd.DataFrame, column: Column, heading: Heading) -> dict[str, object]:
    """Return the typed column in house units, and its bounds if there are any."""
    value = read["value"].to_numpy(dtype=float) * heading.factor
    value = np.where(_out_of_range(value, column) | _not_whole(value, column), np.nan, value)
    bounded = (read["bound"] != "").to_numpy(dtype=bool) & np.isfinite(value)
    typed: dict[str, object] = {column.name: pd.Series(value, read.index).astype(column.dtype)}  # type: ignore[call-overload]
    if bounded.any():
        typed[f"{column.name}_bound"] = read["bound"].astype("string").where(bounded)
    return typed


def _out_of_range(value: NDArray[np.float64], column: Column) -> Flags:
    low = -np.inf if column.minimum is None else column.minimum
    high = np.inf if column.maximum is None else column.maximum
    # -1 in a column that may hold NP is a code for it; `plasticity` reads the three limits together.
    code = column.nonplastic & (value == numbers.NONPLASTIC_CODE)
    outside: Flags = ((value < low) | (value > high)) & ~code
    return outside


def _not_whole(value: NDArray[np.float64], column: Column) -> Flags:
    broken: Flags = np.isfinite(value) & (value != np.floor(value)) & (column.type == "integer")
    return broken


def _findings(
    rows: pd.DataFrame, cells: pd.Series, read: pd.DataFrame, column: Column, heading: Heading
) -> list[pd.DataFrame]:
    """Return the findings about one column."""
    allowed = _allowed(column, heading)
    found = cells.fillna("").to_numpy(dtype=object)
    kind = read["kind"].to_numpy(dtype=object)
    is_number = column.type in ("number", "integer")
    checks = [(kind == name, check) for name, check in (numbers.KINDS if is_number else words.KINDS).items()]
    parts = []
    if is_number:
        value = read["value"].to_numpy(dtype=float) * heading.factor
        outside = _out_of_range(value, column)
        negative = outside & (value < 0) & (column.name in ("depth_m", "top_depth_m", "base_depth_m"))
        checks += [
            (outside & ~negative, OUT_OF_RANGE),
            (negative, NEGATIVE_DEPTH),
            (_not_whole(value, column), NOT_WHOLE),
        ]
        if heading.factor != 1.0 and np.isfinite(value).any():
            parts.append(_converted(rows, column, heading))
    elif column.name in words.NAME_COLUMNS:
        checks.append((damage.may_have_lost_zeros(rows[column.name]), LOST_ZEROS))
    for mask, check in checks:
        if mask.any():
            worded = dataclasses.replace(check, allowed=check.allowed or allowed)
            parts.append(worded.rows(rows, mask, heading.found, _with_reading(found, read, check)))
    return parts


def _with_reading(found: Texts, read: pd.DataFrame, check: Check) -> Texts:
    """Return the texts found; where a text was read as another word or date, that reading follows it."""
    if check.name not in ("other word for a choice", "date in another order"):
        return found
    return np.asarray(found + " (read as " + read["value"].fillna("").to_numpy(dtype=object) + ")", dtype=object)


def _converted(rows: pd.DataFrame, column: Column, heading: Heading) -> pd.DataFrame:
    unit = _UNIT_WORDS.get(column.unit, column.unit)
    check = dataclasses.replace(
        CONVERTED, allowed=unit, advice=CONVERTED.advice.format(factor=heading.factor, unit=unit)
    )
    place = {"file": str(rows["file"].iloc[0]), "sheet": str(rows["sheet"].iloc[0])}
    return check.row(heading.found, f"values in {heading.unit or 'another unit'}", **place)


def _allowed(column: Column, heading: Heading) -> str:
    """Return what may stand in a column, in the unit of its heading."""
    unit = heading.unit or _UNIT_WORDS.get(column.unit, column.unit)
    limits = {
        name: None if limit is None else limit / heading.factor
        for name, limit in (("minimum", column.minimum), ("maximum", column.maximum))
    }
    text = dataclasses.replace(column, **limits).allowed  # type: ignore[arg-type]
    return f"{text} ({unit})" if unit not in ("", "crs") else text


def _one_after_other(first: Entries, second: Entries) -> Entries:
    rows = pd.concat([first.rows, second.rows], ignore_index=True)
    layout = schema.inputs()[first.layout]
    return Entries(
        first.layout,
        schema.conform(rows, layout, extra=EXTRA_COLUMNS),
        pd.concat([first.cells, second.cells], ignore_index=True),
        {**first.headings, **second.headings},
    )
