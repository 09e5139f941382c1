"""The profile of the page: steps, cells with their odds, levels, and the samples behind each step."""

from __future__ import annotations

import json
from collections.abc import Iterable, Sequence
from operator import itemgetter
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.exports.groups import SYMBOL_COLUMN, first_system
from geomap.exports.web_columns import ALPHABET, characters, numbers, percents, positions, words
from geomap.results import Results

SUITABILITY = ("suitable", "treat", "unsuitable", "not assessed")
EVIDENCE = ("observed", "inferred", "no data")
MATERIAL = ("natural", "mixed", "imported")
LEAST_SHARE = 0.005  # up to here a share rounds to no percent
TRACE_ROWS = 12  # samples named for one step; the page says how many more there are and their weight


def symbols_present(results: Results, system: str) -> list[str]:
    """Return the symbols of `system` that occur in cells, steps or samples, in the order of the legend."""
    tables = results.tables
    cells = tables["profile_cells"]
    found = {symbol for row in _read_odds(_odds_texts(cells, system).dropna().unique()) for symbol in row}
    columns = [tables["samples"].get(SYMBOL_COLUMN[system], pd.Series(dtype="string"))]
    if system == first_system(results):
        columns += [cells["soil_group"], tables["subgrade"]["soil_group"]]
        columns += [tables["strata"]["visual_group"]] if system == "astm_d2487" else []
    for column in columns:
        found |= set(column.dropna().astype(str))
    ordered = [symbol for symbol in results.symbols(system) if symbol in found]
    return ordered + sorted(found - set(ordered))


def steps(results: Results, symbols: Sequence[str]) -> dict[str, Any]:
    """Return the subgrade layer by column."""
    table = results.tables["subgrade"]
    return {
        "from": numbers(table["from_distance_m"], 3),
        "to": numbers(table["to_distance_m"], 3),
        "formation": numbers(table["formation_level_m"], 3),
        "cutFill": numbers(table["cut_fill_m"], 3),
        "material": characters(positions(table["subgrade_material"], MATERIAL)),
        "group": characters(positions(table["soil_group"], symbols)),
        "probability": percents(table["probability"]),
        "aashto": words(table["aashto_group"]),
        "suitability": characters(positions(table["suitability"], SUITABILITY)),
        **{f"p{k}": percents(table[f"p_{word.replace(' ', '_')}"]) for k, word in enumerate(SUITABILITY)},
        "evidence": characters(positions(table["evidence"], EVIDENCE)),
        "cbr": {part: numbers(table[f"cbr_{part}_pct"], 1) for part in ("low", "mid", "high")},
        "cbrBasis": words(table["cbr_basis"]),
        "nearest": words(table["nearest_boring"]),
        "nearestM": numbers(table["nearest_boring_m"], 1),
        "samplesUsed": numbers(table["samples_used"], 0),
        "rule": words(table["rule"]),
    }


def cells(results: Results, system: str, symbols: Sequence[str]) -> dict[str, Any]:
    """Return the profile cells as texts of one or two characters a cell, step after step from the top down.

    A cell's place is found from its distance and depth, so a missing cell is a gap and not a shift.
    """
    table = results.tables["profile_cells"]
    starts, step_at = np.unique(table["from_distance_m"].to_numpy(float), return_inverse=True)
    tops, layer_at = np.unique(np.round(table["top_depth_m"].to_numpy(float), 3), return_inverse=True)
    table = table.set_axis(step_at * len(tops) + layer_at, axis=0).reindex(range(len(starts) * len(tops)))
    bases = table["base_depth_m"].to_numpy(float).reshape(len(starts), len(tops))
    ground = (table["top_level_m"] + table["top_depth_m"]).to_numpy(float).reshape(bases.shape)
    ends = table["to_distance_m"].to_numpy(float).reshape(bases.shape)
    return {
        "from": numbers(starts, 3),
        "to": numbers(_first_known(ends, axis=1), 3),
        "ground": numbers(_first_known(ground, axis=1), 3),
        "tops": numbers(tops, 3),
        "bases": numbers(_first_known(bases, axis=0), 3),
        "group": characters(positions(table["soil_group"], symbols)),
        "probability": percents(table["probability"]),
        "evidence": characters(positions(table["evidence"], EVIDENCE)),
        "suitability": characters(positions(table["suitability"], SUITABILITY)),
        "unsuitable": percents(table["p_unsuitable"]),
        "odds": " ".join(odds(_odds_texts(table, system), symbols)),
    }


def odds(texts: pd.Series, symbols: Sequence[str]) -> list[str]:
    """Return three characters for each symbol of each text, likeliest first: its place, then its percent.

    A symbol that rounds to no percent at all is dropped.

    Examples
    --------
    >>> odds(pd.Series(['{"CL": 0.2, "SM": 0.8}', None]), ["CL", "SM"])
    ['12800k', '']
    """
    codes, unique = pd.factorize(texts)
    place = dict(zip(symbols, ALPHABET, strict=False))
    pairs = [
        sorted([pair for pair in row.items() if pair[1] > LEAST_SHARE], key=itemgetter(1), reverse=True)
        for row in _read_odds(unique)
    ]
    packed = percents([share for row in pairs for _, share in row])  # all at once: there are tens of thousands
    at = 0
    short: list[str] = [""]
    for row in pairs:
        short.append("".join(place[symbol] + packed[at + 2 * k : at + 2 * k + 2] for k, (symbol, _) in enumerate(row)))
        at += 2 * len(row)
    return [short[code + 1] for code in codes.tolist()]


def ground(results: Results) -> dict[str, Any]:
    """Return levels along the line, and the words that say what the ground was taken from."""
    table = results.tables["ground"]
    return {
        "distance": numbers(table["distance_m"], 3),
        "ground": numbers(table["ground_level_m"], 3),
        "formation": numbers(table["formation_level_m"], 3),
        "basis": sorted(set(table["ground_basis"].dropna().astype(str))),
    }


def trace(results: Results) -> dict[str, Any]:
    """Return the records behind the steps: each record once, then step after step their numbers and weights.

    The weightiest `TRACE_ROWS` of a step are named, ``count`` of them for each step; ``more`` and ``rest`` give the
    number and the weight of the others. Weights are in thousandths.
    """
    table = results.tables["trace"].reset_index(drop=True)
    identity = ["boring", "sample", "top_depth_m", "base_depth_m", "lab_sheet", "file", "sheet", "row_number"]
    record = table.groupby(identity, dropna=False, sort=False).ngroup()
    records = table.loc[~record.duplicated(), identity]
    table = table.assign(record=record).sort_values(["step", "weight"], ascending=[True, False], kind="stable")
    rank = table.groupby("step").cumcount()
    order = results.tables["subgrade"]["step"].astype("int64")
    named, others = (table.loc[rows & table["step"].isin(order)] for rows in (rank < TRACE_ROWS, rank >= TRACE_ROWS))
    rest = others.groupby("step")["weight"]
    return {
        "boring": words(records["boring"]),
        "sample": words(records["sample"]),
        "top": numbers(records["top_depth_m"], 2),
        "base": numbers(records["base_depth_m"], 2),
        "labSheet": words(records["lab_sheet"]),
        "file": words(records["file"]),
        "sheet": words(records["sheet"]),
        "row": numbers(records["row_number"], 0),
        "count": named.groupby("step").size().reindex(order, fill_value=0).tolist(),
        "record": named["record"].tolist(),
        "weight": numbers(named["weight"] * 1000, 0),
        "more": rest.size().reindex(order, fill_value=0).tolist(),
        "rest": numbers(rest.sum().reindex(order, fill_value=0.0) * 1000, 0),
    }


def _read_odds(texts: Iterable[str]) -> list[dict[str, float]]:
    """Return the odds of many texts, read in one go: one call for each would take most of the page's time."""
    rows: list[dict[str, float]] = json.loads(f"[{','.join(texts)}]")
    return rows


def _odds_texts(table: pd.DataFrame, system: str) -> pd.Series:
    name = f"{system}_odds"
    return table[name] if name in table.columns else pd.Series(None, table.index, dtype="string", name=name)


def _first_known(values: NDArray[np.float64], axis: int) -> NDArray[np.float64]:
    known = np.isfinite(values)
    first = np.expand_dims(known.argmax(axis=axis), axis)
    return np.take_along_axis(values, first, axis=axis).squeeze(axis)
