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
from geomap.exports.web_columns import ALPHABET, characters, numbers, percents, positions, whole_percents, words
from geomap.results import Results

SUITABILITY = ("suitable", "treat", "unsuitable", "not assessed")
EVIDENCE = ("observed", "inferred", "no data")
MATERIAL = ("natural", "mixed", "imported")
NOTHING = "00"  # a share that rounds to no percent
SOURCE_TEXTS = ("boring", "sample", "lab_sheet", "file", "sheet")
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
        **verdict_shares(table),
        "evidence": characters(positions(table["evidence"], EVIDENCE)),
        "cbr": {part: numbers(table[f"cbr_{part}_pct"], 1) for part in ("low", "mid", "high")},
        "cbrBasis": words(table["cbr_basis"]),
        "nearest": words(table["nearest_boring"]),
        "nearestM": numbers(table["nearest_boring_m"], 1),
        "samplesUsed": numbers(table["samples_used"], 0),
        "rule": words(table["rule"]),
    }


def verdict_shares(table: pd.DataFrame) -> dict[str, str]:
    """Return the percents of each verdict of a step; those of one step together 100."""
    shares = table[[f"p_{word.replace(' ', '_')}" for word in SUITABILITY]].to_numpy(float)
    row = np.repeat(np.arange(len(table)), len(SUITABILITY))
    whole = whole_percents(shares.ravel(), row).reshape(shares.shape)
    return {f"p{k}": percents(whole[:, k]) for k in range(len(SUITABILITY))}


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
    rows = [sorted(row.items(), key=itemgetter(1), reverse=True) for row in _read_odds(unique)]
    row_of = np.repeat(np.arange(len(rows)), [len(row) for row in rows])
    # All at once: there are tens of thousands.
    packed = percents(whole_percents(np.array([share for row in rows for _, share in row], dtype=float), row_of))
    at = 0
    short: list[str] = [""]
    for row in rows:
        parts = [(place[symbol], packed[at + 2 * k : at + 2 * k + 2]) for k, (symbol, _) in enumerate(row)]
        short.append("".join(symbol + percent for symbol, percent in parts if percent != NOTHING))
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
    """Return the specimens behind the steps: each once, then step after step their numbers and weights.

    A specimen may have several rows, one for each test: they share one weight, and their names, lab sheets and row
    numbers stand side by side. The weightiest `TRACE_ROWS` of a step are named, ``count`` of them for each step;
    ``more`` and ``rest`` give the number and the weight of the others. Weights are in thousandths.
    """
    table = results.tables["trace"].reset_index(drop=True)
    record, records = specimens(table)
    table = table.assign(record=record).drop_duplicates(["step", "record"])
    table = table.sort_values(["step", "weight"], ascending=[True, False], kind="stable")
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
        "row": words(records["row_number"]),
        "count": named.groupby("step").size().reindex(order, fill_value=0).tolist(),
        "record": named["record"].tolist(),
        "weight": numbers(named["weight"] * 1000, 0),
        "more": rest.size().reindex(order, fill_value=0).tolist(),
        "rest": numbers(rest.sum().reindex(order, fill_value=0.0) * 1000, 0),
    }


def specimens(trace: pd.DataFrame) -> tuple[pd.Series, pd.DataFrame]:
    """Return the number of the specimen of each row of the trace, and one row for each specimen.

    A row without a specimen stands for itself.
    """
    identity = [name for name in trace.columns if name not in ("step", "weight")]
    row = trace.groupby(identity, dropna=False, sort=False).ngroup()
    given = trace.get("specimen", pd.Series(np.nan, trace.index)).astype("Float64")
    of = trace.assign(key=given.fillna(-1.0 - row)).groupby(["boring", "key"], dropna=False, sort=False).ngroup()
    rows = trace.loc[~row.duplicated()]
    by = rows.assign(row_number=rows["row_number"].astype("Int64").astype("string")).groupby(of, sort=True)
    texts = {name: by[name].agg(_side_by_side) for name in (*SOURCE_TEXTS, "row_number")}
    depths = {"top_depth_m": by["top_depth_m"].min(), "base_depth_m": by["base_depth_m"].max()}
    return of, pd.DataFrame({**texts, **depths})


def _side_by_side(texts: pd.Series) -> str | None:
    return ", ".join(dict.fromkeys(texts.dropna().astype(str))) or None


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
