"""Findings: one row for each query about one input value.

The layout is ``layers.findings`` of `layouts.toml`. Action words: accept, convert, query, hold_out, reject, block.
"""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd

from geomap.tables import schema

SEVERITY_OF_ACTION = {
    "accept": "note",
    "convert": "note",
    "query": "warning",
    "hold_out": "warning",
    "reject": "error",
    "block": "error",
}


@dataclass(frozen=True)
class Check:
    """What one check says about every value that it finds: its name, its action and its words."""

    name: str
    action: str
    allowed: str
    advice: str
    severity: str = ""

    def rows(self, table: pd.DataFrame, mask: np.ndarray | pd.Series, heading: object, found: object) -> pd.DataFrame:
        """Return one finding for each row of `table` where `mask` is true.

        Parameters
        ----------
        table
            Rows with ``file``, ``sheet``, ``row_number`` and, where they have them, ``boring`` and ``sample``.
        mask
            Boolean, one for each row; missing counts as false.
        heading, found
            A text for all rows, or an array or series with one entry for each row of `table`.
        """
        picked = np.asarray(pd.Series(mask).fillna(False), dtype=bool)
        rows = table.loc[picked]
        frame = pd.DataFrame(index=rows.index)
        for name in ("file", "sheet", "row_number", "boring", "sample"):
            if name in rows.columns:
                frame[name] = rows[name]
        frame["heading"] = _picked(heading, picked)
        frame["found"] = _picked(found, picked)
        frame["topic"] = self.name
        frame["allowed"] = self.allowed
        frame["action"] = self.action
        frame["severity"] = self.severity or SEVERITY_OF_ACTION[self.action]
        frame["advice"] = self.advice
        return conform(frame)

    def row(self, heading: str = "", found: object = "", **place: object) -> pd.DataFrame:
        """Return one finding about a whole file or column; `place` gives file, sheet, row_number, boring, sample."""
        table = pd.DataFrame({name: [value] for name, value in place.items()}, index=[0])
        return self.rows(table, np.array([True]), heading, str(found))


def _picked(value: object, picked: np.ndarray) -> Any:
    if isinstance(value, str):
        return value
    return np.asarray(value, dtype=object)[picked]


def conform(frame: pd.DataFrame) -> pd.DataFrame:
    """Return `frame` in the layout of findings, on a fresh index."""
    return schema.conform(frame.reset_index(drop=True), schema.layers()["findings"])


def together(parts: Iterable[pd.DataFrame]) -> pd.DataFrame:
    """Return all findings as one table, in the order given."""
    filled = [part for part in parts if len(part)]
    return conform(pd.concat(filled, ignore_index=True) if filled else pd.DataFrame())
