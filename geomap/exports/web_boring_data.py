"""The borings of the page with their samples, logged layers and findings."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import pandas as pd

from geomap.exports.groups import SYMBOL_COLUMN
from geomap.exports.web_columns import characters, numbers, positions, words
from geomap.exports.web_profile_data import SUITABILITY
from geomap.results import Results

# The tests that the boring card shows beside a sample: key in the page, column, decimals.
TESTS = (
    ("fines", "fines_pct", 0),
    ("liquidLimit", "liquid_limit_pct", 0),
    ("plasticLimit", "plastic_limit_pct", 0),
    ("plasticityIndex", "plasticity_index_pct", 0),
    ("moisture", "moisture_pct", 1),
    ("organic", "organic_pct", 1),
    ("cbrSoaked", "cbr_soaked_pct", 1),
    ("cbrUnsoaked", "cbr_unsoaked_pct", 1),
    ("cbrInPlace", "cbr_in_place_pct", 1),
    ("sptN", "spt_n", 0),
)


def borings(results: Results) -> dict[str, Any]:
    """Return the borings layer by column."""
    table = results.tables["borings"]
    return {
        "name": table["boring"].astype(str).tolist(),
        "distance": numbers(table["distance_m"], 2),
        "offset": numbers(table["offset_m"], 2),
        "side": words(table["side"]),
        "ground": numbers(table["ground_level_m"], 2),
        "depth": numbers(table["depth_m"], 2),
        "date": words(table["date"]),
        "method": words(table["method"]),
        "used": characters(positions(table["status"], ("left out", "used"))),
        "reason": words(table["reason"]),
        "remarks": words(table["remarks"]),
        **_source(table),
    }


def samples(results: Results, system: str, symbols: Sequence[str]) -> dict[str, Any]:
    """Return the samples layer by column: identity, groups with basis, key tests, verdict and source."""
    table = results.tables["samples"]
    column = SYMBOL_COLUMN[system]
    return {
        "boring": _boring_rows(results, table),
        "sample": words(table["sample"]),
        "top": numbers(table["top_depth_m"], 2),
        "base": numbers(table["base_depth_m"], 2),
        "group": characters(positions(table[column], symbols)),
        "basis": words(table[f"{column}_basis"]),
        "why": words(table[f"{column}_reason"]),
        "candidates": words(table[f"{column}_candidates"]),
        "nearLimit": characters(positions(table[f"{column}_near_limit"], (False, True))),
        "name": words(table["uscs_name"]),
        "visual": words(table["visual_group"]),
        "aashto": words(table["aashto_group"]),
        "groupIndex": numbers(table["group_index"], 0),
        "description": words(table["description"]),
        "nonplastic": characters(positions(table["is_nonplastic"], (False, True))),
        "tests": {key: numbers(table[name], digits) for key, name, digits in TESTS},
        "bounds": {key: words(table[f"{name}_bound"]) for key, name, _ in TESTS if f"{name}_bound" in table},
        "suitability": characters(positions(table["suitability"], SUITABILITY)),
        "suitabilityWhy": words(table["suitability_reason"]),
        "rule": words(table["rule"]),
        "used": characters(positions(table["status"], ("left out", "used"))),
        "reason": words(table["reason"]),
        "labSheet": words(table["lab_sheet"]),
        **_source(table),
    }


def strata(results: Results, symbols: Sequence[str]) -> dict[str, Any]:
    """Return the logged layers by column; `symbols` are those of the first system."""
    table = results.tables["strata"]
    return {
        "boring": _boring_rows(results, table),
        "top": numbers(table["top_depth_m"], 2),
        "base": numbers(table["base_depth_m"], 2),
        "group": characters(positions(table["visual_group"], symbols)),
        "visual": words(table["visual_group"]),
        "description": words(table["description"]),
        "origin": words(table["origin"]),
        "unit": words(table["unit"]),
    }


def findings(results: Results) -> dict[str, Any]:
    """Return the findings layer by column, the severest first."""
    table = results.tables["findings"]
    rank = table["severity"].map({"error": 0, "warning": 1, "note": 2}).fillna(3)
    table = table.iloc[rank.argsort(kind="stable")]
    texts = ("severity", "action", "topic", "heading", "boring", "sample", "found", "allowed", "advice")
    return {name: words(table[name]) for name in texts} | _source(table)


def _source(table: pd.DataFrame) -> dict[str, Any]:
    sheet = table["sheet"] if "sheet" in table.columns else pd.Series(None, table.index, dtype="string")
    return {"file": words(table["file"]), "sheet": words(sheet), "row": numbers(table["row_number"], 0)}


def _boring_rows(results: Results, table: pd.DataFrame) -> list[int]:
    """Return the row of each boring in the borings layer, the first of several that share a name; -1 for none."""
    row_of: dict[str, int] = {}
    for row, name in enumerate(results.tables["borings"]["boring"].astype(str)):
        row_of.setdefault(name, row)
    return [row_of.get(name, -1) for name in table["boring"].fillna("").astype(str)]
