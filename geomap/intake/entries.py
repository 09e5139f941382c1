"""Tables on their way through intake: typed rows, the cells they came from, and the findings so far.

Every check takes an :class:`Intake` and returns a new one. A check may leave out a row (the row stays, its
status says so), set aside a value (the value becomes missing, the cell keeps its text) or only ask.
"""

from __future__ import annotations

import dataclasses
import functools
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.tables import findings, schema
from geomap.tables.findings import Check

USED = "used"
LEFT_OUT = "left out"

Flags = NDArray[np.bool_]
Texts = NDArray[np.object_]


@dataclass(frozen=True)
class Entries:
    """The rows of one input table.

    Attributes
    ----------
    layout
        Name of the input layout, for example ``"samples"``.
    rows
        Typed columns of the layout, then ``file, sheet, row_number, status, reason``; a RangeIndex.
    cells
        The text of each recognized cell as the file has it, on the same index.
    headings
        For each (file, sheet), the heading as found of each column.
    """

    layout: str
    rows: pd.DataFrame
    cells: pd.DataFrame
    headings: Mapping[tuple[str, str], Mapping[str, str]]

    @property
    def used(self) -> Flags:
        """True for each row that is still used."""
        return (self.rows["status"] == USED).to_numpy(dtype=bool)

    def missing(self, column: str) -> Flags:
        """Return True for each row without a value in `column`."""
        return self.rows[column].isna().to_numpy(dtype=bool)

    def numbers(self, column: str) -> NDArray[np.float64]:
        """Return a number column as an array; NaN where missing."""
        return self.rows[column].to_numpy(dtype=float, na_value=np.nan)

    def bounded(self, column: str) -> Flags:
        """Return True where `column` is given as less or more than its number."""
        bound = f"{column}_bound"
        return np.zeros(len(self.rows), bool) if bound not in self.rows.columns else ~self.missing(bound)

    def texts(self, column: str) -> Texts:
        """Return the cells of `column` as found; blank where there is nothing."""
        if column not in self.cells.columns:
            return np.full(len(self.rows), "", dtype=object)
        return self.cells[column].fillna("").to_numpy(dtype=object)

    def heading(self, *columns: str) -> Texts:
        """Return, for each row, the headings of `columns` as written in its file, joined by a comma."""
        if "heading" in self.rows.columns and columns == ("passing_pct",):  # each point knows its own
            return self.rows["heading"].fillna("").to_numpy(dtype=object)
        names = {
            source: ", ".join(found[c] for c in columns if c in found) or schema.column(columns[0]).title
            for source, found in self.headings.items()
        }
        if len(names) == 1:
            return np.full(len(self.rows), next(iter(names.values())), dtype=object)
        sources = pd.Series(list(zip(self.rows["file"], self.rows["sheet"].fillna(""), strict=True)), dtype=object)
        return sources.map(names).fillna("").to_numpy(dtype=object)

    def found(self, *columns: str) -> Texts:
        """Return, for each row, the cells of `columns` as found: ``20``, or ``LL 20, PL 30`` for several."""
        if len(columns) == 1:
            texts = self.texts(columns[0])
            return np.where(texts == "", "blank", texts)
        joined = np.full(len(self.rows), "", dtype=object)
        for column in columns:
            texts = self.texts(column)
            filled = texts != ""
            joiner = np.where((joined != "") & filled, ", ", "")
            joined = joined + joiner + np.where(filled, self.heading(column) + " " + texts, "")
        return np.where(joined == "", "blank", joined)

    def findings_of(self, check: Check, mask: Flags, *columns: str, found: object = None) -> pd.DataFrame:
        """Return one finding of `check` for each row where `mask` is true, about the cells of `columns`."""
        if not mask.any():
            return pd.DataFrame()
        words = self.found(*columns) if found is None else found
        return check.rows(self.rows, mask, self.heading(*columns), words)

    def leave_out(self, mask: Flags, reason: object) -> Entries:
        """Return the entries with the rows of `mask` left out; a row left out before keeps its first reason.

        Parameters
        ----------
        mask
            Boolean, one for each row.
        reason
            A text, or an array of texts with one entry for each row.
        """
        fresh = mask & self.used
        if not fresh.any():
            return self
        rows = self.rows.copy()
        rows.loc[fresh, "status"] = LEFT_OUT
        rows.loc[fresh, "reason"] = reason if isinstance(reason, str) else np.asarray(reason, dtype=object)[fresh]
        return dataclasses.replace(self, rows=rows)

    def set_aside(self, mask: Flags, *columns: str) -> Entries:
        """Return the entries with the values of `columns` missing where `mask` is true; the cells keep their text."""
        if not mask.any():
            return self
        rows = self.rows.copy()
        for column in columns:
            for name in (column, f"{column}_bound"):
                if name in rows.columns:
                    rows.loc[mask, name] = np.nan if rows[name].dtype == "float64" else pd.NA
        return dataclasses.replace(self, rows=rows)

    def with_values(self, mask: Flags, column: str, value: object) -> Entries:
        """Return the entries with `value` (one, or one for each row) in `column` where `mask` is true."""
        if not mask.any():
            return self
        rows = self.rows.copy()
        rows.loc[mask, column] = value[mask] if isinstance(value, np.ndarray) else value  # type: ignore[call-overload]
        return dataclasses.replace(self, rows=rows)


@dataclass(frozen=True)
class Intake:
    """All input tables and what has been found out about them.

    Attributes
    ----------
    entries
        The tables by layout name.
    parts
        Findings so far, in the order of the checks.
    """

    entries: Mapping[str, Entries]
    parts: tuple[pd.DataFrame, ...] = ()

    @functools.cached_property
    def findings(self) -> pd.DataFrame:
        """One row for each query, in the layout of ``layers.findings``."""
        return findings.together(self.parts)

    def __contains__(self, name: str) -> bool:
        return name in self.entries

    def __getitem__(self, name: str) -> Entries:
        return self.entries[name]

    def having(self, entries: Entries, *parts: pd.DataFrame) -> Intake:
        """Return the intake with one table replaced or added, and further findings."""
        tables = {**self.entries, entries.layout: entries}
        return Intake(tables, (*self.parts, *(part for part in parts if len(part))))

    def rows(self, name: str) -> pd.DataFrame:
        """Return every row of a table, with ``status`` and ``reason``."""
        return self.entries[name].rows.copy()

    def used(self, name: str) -> pd.DataFrame:
        """Return the rows of a table that are used; the index is that of :meth:`rows`.

        For ``gradations``: columns ``sample_row`` (index value into samples), ``size_mm``, ``passing_pct``,
        ``file``, ``sheet``, ``row_number``, ``heading``.
        """
        entries = self.entries[name]
        rows = entries.rows.loc[entries.used]
        if "sample_row" in rows.columns:
            names = ["sample_row", "size_mm", "passing_pct", "file", "sheet", "row_number", "heading"]
            return rows[names].astype({"sample_row": "int64"})
        return rows.copy()

    def counts(self) -> pd.DataFrame:
        """Return, for each table, how many rows were read, used and left out: read = used + left_out."""
        read, used = [], []
        for entries in self.entries.values():
            own = entries.rows["in_layout"].to_numpy(dtype=bool) if "in_layout" in entries.rows else np.True_
            read.append(int(np.sum(np.ones(len(entries.rows), dtype=bool) & own)))
            used.append(int(np.sum(entries.used & own)))
        table = pd.DataFrame({"table": pd.array(list(self.entries), dtype="string"), "read": read, "used": used})
        return table.assign(left_out=table["read"] - table["used"])

    @property
    def blocks(self) -> pd.DataFrame:
        """The findings that end the run."""
        return self.findings.loc[self.findings["action"] == "block"]
