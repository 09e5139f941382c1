"""What a run found out: the named tables that every output is drawn from.

Exports read this and nothing else, so a map, a schedule and a layer cannot disagree.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy import sparse

CAUTIONS = (
    "Boundaries between borings are inferred; ground may differ between borings and between samples.",
    "Values are as good as the tests behind them; water is as on its date.",
    "Preliminary: for review by a licensed engineer. Local codes and the contract govern.",
    "Quantities are for planning.",
    "Not for construction, payment or trench safety, where the competent person on site decides.",
)


@dataclass(frozen=True)
class Results:
    """The answer for one corridor.

    Attributes
    ----------
    name, use, issue
        Name of the corridor, ``road`` or ``pipeline``, and the issue stamped on every output.
    crs
        Projected coordinate reference system of all geometry, as an authority code or WKT.
    vertical_datum
        What levels are measured from.
    length_unit
        Unit in which people read lengths: m, ft or us-ft. All tables are in meters.
    chainage_format
        ``0+000`` (meters by the kilometer) or ``0+00`` (feet by the hundred).
    chainage_breaks
        Pairs of distance [m] and the chainage value there [m]; between breaks chainage grows with distance.
        The first pair is the start; each further one is the ahead side of a chainage equation.
    tables
        The layers by name (`geomap.tables.schema.layers`), each with a ``geometry`` column where its layout says
        so, and for the profile: ``records``, ``ground`` (distance_m, ground_level_m, formation_level_m, ground_basis),
        ``strata`` (the logged layers that are used, with distance_m and offset_m) and ``counts`` (table, read,
        used, left_out).
    legend
        One row for each code of each system and of the verdicts: system, code, symbol, name, order.
    draws
        Verdict code of the design zone by step and realization, shape (steps, realizations), fill counted in; no
        columns without a formation.
    weights
        Share of each record in each cell, sparse, shape (cells, records): rows as in ``profile_cells``, columns as in
        the table ``records`` (specimen, boring, sample, depths, file, sheet, row_number). What is left to 1 is the
        background.
    cautions
        Texts that every output for people carries.
    """

    name: str
    use: str
    issue: str
    crs: str
    vertical_datum: str
    length_unit: str
    chainage_format: str
    chainage_breaks: tuple[tuple[float, float], ...]
    tables: Mapping[str, pd.DataFrame]
    legend: pd.DataFrame
    draws: NDArray[np.int8]
    weights: sparse.csr_array
    cautions: tuple[str, ...] = CAUTIONS

    def symbols(self, system: str) -> list[str]:
        """Return the symbols of one system in the order of its legend."""
        rows = self.legend.loc[self.legend["system"] == system]
        return rows.sort_values("order")["symbol"].tolist()

    def run_value(self, key: str) -> str:
        """Return one value of the ``run`` table, or a blank text."""
        run = self.tables["run"]
        found = run.loc[run["key"] == key, "value"]
        return str(found.iloc[0]) if len(found) else ""

    def summary(self) -> dict[str, object]:
        """Return the answer in short, ready for JSON: lengths, counts, findings by severity, totals of the run."""
        run = self.tables["run"].set_index("key")["value"]
        lengths = {key: float(run[key]) for key in run.index if key.startswith("length_")}
        severities = self.tables["findings"]["severity"].value_counts()
        return {
            "name": self.name,
            "issue": self.issue,
            **lengths,
            "tables": self.tables["counts"].to_dict(orient="records"),
            "findings": {str(word): int(count) for word, count in severities.items()},
            "estimation": self.run_value("estimation"),
            "cautions": list(self.cautions),
        }
