"""The results laid out from what the stages found: layers, legend, and the record of the run.

Nothing is judged or estimated here: columns are chosen, places are labeled, geometry is attached.
"""

from __future__ import annotations

import functools
import platform
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from importlib import metadata

import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray
from scipy import sparse

from geomap import inputs
from geomap.corridor import Corridor
from geomap.errors import problem
from geomap.gate import Gate, logged
from geomap.ground.neighbors import Ranges
from geomap.profile.cells import Sheet
from geomap.results import CAUTIONS, Results
from geomap.tables import schema

Label = Callable[[NDArray[np.float64]], "pd.Series[str]"]
DERIVED = [
    "cobbles_pct",
    "boulders_pct",
    "d10_mm",
    "d30_mm",
    "d60_mm",
    "cu",
    "cc",
]  # of the specimen, reported or worked out
RECORD = ["specimen", "boring", "sample", "top_depth_m", "base_depth_m", "file", "sheet", "row_number"]
DECIMALS = 6  # of numbers in layers: finer than any test or survey
FIXED = "fixed default, common practice, no source"
LIBRARIES = ("numpy", "scipy", "pandas", "shapely", "pyproj", "geopandas", "pyogrio", "folium")


@dataclass(frozen=True)
class Found:
    """What the second half of the job found.

    Attributes
    ----------
    sheet
        Where the cells are.
    ranges
        The ranges of the estimate and where they come from, in words.
    steps, cells, trace
        Tables by step, by cell, and by step and record.
    draws
        Verdict codes, shape (steps, realizations).
    limits
        The limits of the verdicts, in words.
    weights, records
        Shares of the records in each cell of the sheet, and the records.
    """

    sheet: Sheet
    ranges: str
    steps: pd.DataFrame
    cells: pd.DataFrame
    trace: pd.DataFrame
    draws: NDArray[np.int8]
    limits: str
    weights: sparse.csr_array
    records: pd.DataFrame


def results(gate: Gate, found: Found, verdicts: Sequence[str]) -> Results:
    """Return the results of a run."""
    about, taken, sheet = gate.job.corridor.corridor, gate.taken, found.sheet
    label = functools.partial(gate.chainage.label_from_distance, decimals=2)
    holes = borings(taken.rows("borings"), gate.placed, label)
    ends = {"from_distance_m": "from_chainage", "to_distance_m": "to_chainage"}
    subgrade = with_labels(found.steps, label, ends).assign(geometry=gate.line.pieces(gate.edges))
    ground = pd.DataFrame(
        {
            "distance_m": sheet.centers,
            "ground_level_m": sheet.levels.ground,
            "formation_level_m": sheet.levels.formation,
            "width_m": sheet.levels.width,
            "zone_depth_m": sheet.zone_depth,
            "ground_basis": gate.levels.ground_basis,
        }
    )
    tables = {
        "alignment": alignment(about.name, gate, ground),
        "borings": holes,
        "samples": samples(taken.rows("samples"), gate.judged, holes),
        "subgrade": layer("subgrade", subgrade),
        "profile_cells": layer("profile_cells", found.cells),
        "trace": layer("trace", found.trace),
        "findings": gate.findings,
        "ground": ground,
        "strata": gate.located(logged(taken)).reset_index(drop=True),
        "counts": gate.counts,
        "records": found.records[RECORD].reset_index(drop=True),
    }
    tables["run"] = run_record(gate, found, tables["subgrade"])
    return Results(
        name=about.name,
        use=about.use,
        issue=about.issue,
        crs=about.crs,
        vertical_datum=about.vertical_datum,
        length_unit=about.length_unit,
        chainage_format=about.chainage_format,
        chainage_breaks=gate.chainage.breaks,
        tables=tables,
        legend=legend({s.NAME: {n: s.SYMBOL_NAMES[n] for n in s.SYMBOLS} for s in gate.job.systems}, verdicts),
        draws=found.draws if gate.job.corridor.formation else found.draws[:, :0],
        weights=sparse.csr_array(found.weights[np.flatnonzero(sheet.is_used)]),
    )


def sentences(findings: pd.DataFrame) -> list[str]:
    """Return each finding as one sentence in the house pattern."""
    texts = findings.astype("string").fillna("")
    return [
        problem(
            ", ".join(part for part in (file, sheet, row and f"row {row}", heading) if part), found, allowed, advice
        )
        for file, sheet, row, heading, found, allowed, advice in texts[
            ["file", "sheet", "row_number", "heading", "found", "allowed", "advice"]
        ].itertuples(index=False)
    ]


def ranges_in_words(ranges: Ranges, corridor: Corridor) -> str:
    """Return the ranges of the estimate and whether the user gave them."""
    given = corridor.estimation
    parts = [
        f"{ranges.horizontal:g} m along and across the line ({'given' if given.horizontal_range_m else FIXED})",
        f"{ranges.vertical:g} m in depth ({'given' if given.vertical_range_m else FIXED})",
    ]
    return f"practical ranges {' and '.join(parts)}; nugget {ranges.nugget:g}"


def layer(name: str, frame: pd.DataFrame) -> pd.DataFrame:
    """Return `frame` in the layout of an output layer, on a fresh index, without the noise of binary fractions."""
    return schema.conform(frame.reset_index(drop=True).round(DECIMALS), schema.layers()[name])


def with_points(frame: pd.DataFrame) -> pd.DataFrame:
    """Return `frame` with a point for each row that has a place, and none for the others."""
    x, y = (frame[name].to_numpy(float) for name in ("x", "y"))
    placed = np.isfinite(x) & np.isfinite(y)
    geometry = np.full(len(frame), None, dtype=object)
    geometry[placed] = shapely.points(x[placed], y[placed])
    return frame.assign(geometry=geometry)


def with_labels(frame: pd.DataFrame, label: Label, names: Mapping[str, str]) -> pd.DataFrame:
    """Return `frame` with a chainage label for each distance; `names` maps distance column to chainage column."""
    result = frame.copy()
    for distance, chainage in names.items():
        known = frame[distance].notna().to_numpy()
        texts = np.full(len(frame), None, dtype=object)
        texts[known] = label(frame[distance].to_numpy(float)[known]).to_numpy(object)
        result[chainage] = pd.Series(texts, index=frame.index, dtype="string")
    return result


def alignment(name: str, gate: Gate, ground: pd.DataFrame) -> pd.DataFrame:
    """Return the layer ``alignment``: the line, with the level of the ground at each vertex where levels are known.

    Parameters
    ----------
    name
        Name of the corridor.
    gate
        The line and its chainage.
    ground
        ``distance_m`` and ``ground_level_m`` by step.
    """
    line, vertices = gate.line, gate.line.vertices
    level = ground["ground_level_m"].to_numpy(float)
    known = np.isfinite(level)
    if gate.levels.ground_is_known:
        z = np.interp(line.distance, ground["distance_m"].to_numpy(float)[known], level[known])
        vertices = np.column_stack([vertices, z])
    start = gate.chainage.label_from_distance([0.0], decimals=2).iloc[0]
    row = {"name": name, "start_chainage": start, "length_m": line.length_m}
    return layer("alignment", pd.DataFrame([row]).assign(geometry=[shapely.linestrings(vertices)]))


def borings(rows: pd.DataFrame, placed: pd.DataFrame, label: Label) -> pd.DataFrame:
    """Return the layer ``borings``: every boring read, placed where it could be.

    Parameters
    ----------
    rows
        Typed rows with ``status`` and ``reason``.
    placed
        ``x``, ``y``, ``distance_m``, ``offset_m``, ``side`` in the system of the corridor, on the index of `rows` as
        far as they could be placed.
    label
        Chainage labels of distances.
    """
    names = ["x", "y", "distance_m", "offset_m", "side"]
    table = rows.drop(columns=names, errors="ignore").join(placed[names])
    return layer("borings", with_points(with_labels(table, label, {"distance_m": "chainage"})))


def samples(rows: pd.DataFrame, judged: pd.DataFrame, holes: pd.DataFrame) -> pd.DataFrame:
    """Return the layer ``samples``: every sample read; its own tests, then what was derived for its specimen.

    Parameters
    ----------
    rows
        Typed rows with ``status`` and ``reason``.
    judged
        Properties, classes and verdicts of the samples used, on the index of `rows`; they win over columns of the
        same name, but for the limits and other tests of the row itself.
    holes
        The layer ``borings``: places of the holes.
    """
    derived = [n for n in judged.columns if n not in rows.columns or n in DERIVED]
    table = rows.drop(columns=DERIVED, errors="ignore").join(judged[derived])
    index = table["liquid_limit_pct"] - table["plastic_limit_pct"]
    table["plasticity_index_pct"] = table["plasticity_index_pct"].fillna(index)
    where = holes.drop_duplicates("boring").set_index("boring")
    for name in ("distance_m", "chainage", "offset_m", "geometry"):
        table[name] = table["boring"].map(where[name])
    return layer("samples", table)


def legend(systems: Mapping[str, Mapping[str, str]], verdicts: Sequence[str]) -> pd.DataFrame:
    """Return the legend: system, code, symbol, name, order.

    Parameters
    ----------
    systems
        By system: name of each symbol, in the order of the codes from 1. Code 0 is ``n/d``, not determined.
    verdicts
        Words of the verdicts in the order of their codes.
    """
    rows = [
        (system, code, symbol, name)
        for system, names in systems.items()
        for code, (symbol, name) in enumerate({"n/d": "not determined", **names}.items())
    ]
    rows += [("suitability", code, word, word) for code, word in enumerate(verdicts)]
    table = pd.DataFrame(rows, columns=["system", "code", "symbol", "name"])
    # What is not determined comes last in a legend, whatever its code.
    table["order"] = table["code"].where(table["symbol"] != "n/d", 10_000)
    return table


def run_record(gate: Gate, found: Found, subgrade: pd.DataFrame) -> pd.DataFrame:
    """Return the layer ``run``: versions, inputs, standards and rule sets with editions, parameters and totals."""
    job, corridor = gate.job, gate.job.corridor
    rows: dict[str, object] = {
        "geomap version": metadata.version("geomap"),
        "python version": platform.python_version(),
        **{f"{library} version": metadata.version(library) for library in LIBRARIES},
        **{f"corridor {key}": value for key, value in corridor.corridor},
        **{f"sha256 {name}": digest for name, digest in inputs.fingerprints(job).items()},
        **{f"system {system.NAME}": f"{system.SOURCE}, {system.EDITION}" for system in job.systems},
        **{f"rule set {r.name}": f"{r.title}; {r.source}; {r.edition}; {r.flag}" for r in job.rule_sets},
        **{f"subgrade {key}": value for key, value in corridor.subgrade},
        **{f"profile {key}": value for key, value in corridor.profile},
        "estimation": f"neighbor records, plain form: {found.ranges}. Not fitted to this site.",
        "verdict limits": found.limits,
        "realizations": corridor.estimation.realizations,
        "seed": corridor.estimation.seed,
        "ground levels": gate.levels.ground_basis,
        **{f"fill {key}": value for key, value in corridor.fill or ()},
        **totals(subgrade),
        **{f"caution {number}": text for number, text in enumerate(CAUTIONS, 1)},
    }
    kept = {key: value for key, value in rows.items() if value not in ("", None)}
    texts = [", ".join(map(str, v)) if isinstance(v, list) else str(v) for v in kept.values()]
    return layer("run", pd.DataFrame({"key": list(kept), "value": texts}))


def totals(subgrade: pd.DataFrame) -> dict[str, str]:
    """Return lengths of the line by suitability and by evidence [m], as text with one decimal."""
    length = (subgrade["to_distance_m"] - subgrade["from_distance_m"]).to_numpy(float)
    found = {"length_m": f"{length.sum():.1f}"}
    for column in ("suitability", "evidence", "subgrade_material"):
        for word in schema.column(column).choices:
            share = length[(subgrade[column] == word).to_numpy(bool, na_value=False)].sum()
            found[f"length_{word.replace(' ', '_')}_m"] = f"{share:.1f}"
    return found
