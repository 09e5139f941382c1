"""A small, complete, invented corridor: what the exports are tested on.

Otter Brook bypass does not exist. Its 600 m hold lean clay over silty sand over silty gravel, with a pocket of
peat near 300 m, three borings that are used and one that lies too far off. Nothing here was measured; the
numbers were constructed so that every kind of value occurs at least once.
"""

from __future__ import annotations

import json
from collections.abc import Sequence

import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray
from scipy import sparse

from geomap.results import Results
from geomap.tables import schema

STEPS, THICKNESSES = 60, 12
STEP_M, THICKNESS_M = 10.0, 0.5
REALIZATIONS = 40
BREAKS = ((0.0, 12_000.0), (300.0, 12_350.0))  # a chainage equation: 12+300 back is 12+350 ahead

USCS = (
    *("GW", "GP", "GW-GM", "GW-GC", "GP-GM", "GP-GC", "GM", "GC", "GC-GM"),
    *("SW", "SP", "SW-SM", "SW-SC", "SP-SM", "SP-SC", "SM", "SC", "SC-SM"),
    *("ML", "CL-ML", "CL", "OL", "MH", "CH", "OH", "PT"),
)
AASHTO = (
    *("A-1-a", "A-1-b", "A-3", "A-2-4", "A-2-5", "A-2-6", "A-2-7"),
    *("A-4", "A-5", "A-6", "A-7-5", "A-7-6", "A-8"),
)
VERDICTS = ("suitable", "treat", "unsuitable")  # codes 1, 2, 3; code 0 is not assessed

SOILS = ("PT", "CL", "SM", "GM", "n/d")  # soils of this corridor, and what they are by AASHTO M 145
GROUPS = ("A-8", "A-6", "A-2-4", "A-1-b", "n/d")
NAMES = {"PT": "peat", "CL": "sandy lean clay", "SM": "silty sand with gravel", "GM": "silty gravel with sand"}
BORING_DISTANCE_M = np.array([60.0, 290.0, 540.0])
BORING_OFFSET_M = np.array([-4.0, 2.5, 12.0])
BORING_DEPTH_M = np.array([5.0, 4.5, 4.0])


def chainage(distance_m: float, back: bool = False) -> str:
    """Return the chainage label; `back` gives the back side where a chainage equation stands."""
    passed = [pair for pair in BREAKS if pair[0] < distance_m or (pair[0] == distance_m and not back)]
    at, value = passed[-1] if passed else BREAKS[0]
    kilometers, meters = divmod(round(value + distance_m - at, 3), 1000.0)
    return f"{int(kilometers)}+{meters:07.3f}".rstrip("0").rstrip(".")


def vertices() -> NDArray[np.float64]:
    """Return the alignment's vertices, shape (STEPS + 1, 2), exactly one step apart."""
    heading = 0.25 + 0.6 * np.sin(np.arange(STEPS) / STEPS * np.pi)
    steps = STEP_M * np.column_stack([np.cos(heading), np.sin(heading)])
    return np.cumsum(np.vstack([[431_000.0, 5_623_000.0], steps]), axis=0)


def ground_level(distance_m: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the ground level [m]."""
    return np.round(62.0 + 2.0 * np.sin(distance_m / 600.0 * 2 * np.pi), 3)


def formation_level(distance_m: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return the formation level [m]: a grade of 0.1 %, in cut first, then in fill."""
    return np.round(61.5 + 0.001 * distance_m, 3)


def place(distance_m: NDArray[np.float64], offset_m: NDArray[np.float64]) -> NDArray[np.object_]:
    """Return points beside the alignment, right positive."""
    line = vertices()
    segment = np.minimum((distance_m // STEP_M).astype(int), STEPS - 1)
    along = (line[segment + 1] - line[segment]) / STEP_M
    right = np.column_stack([along[:, 1], -along[:, 0]])
    return shapely.points(line[segment] + along * (distance_m - segment * STEP_M)[:, None] + right * offset_m[:, None])


def soil_probabilities() -> NDArray[np.float64]:
    """Return the probability of each of SOILS, shape (STEPS, THICKNESSES, len(SOILS))."""
    distance = (np.arange(STEPS)[:, None] + 0.5) * STEP_M
    depth = (np.arange(THICKNESSES)[None, :] + 0.5) * THICKNESS_M
    gap = np.abs(distance[..., None] - BORING_DISTANCE_M).min(axis=2)
    blur = 0.15 + gap / 120.0
    below = [1 / (1 + np.exp(-(depth - base) / blur)) for base in (1.6 + 0.8 * np.sin(distance / 90.0), 3.8)]
    peat = np.exp(-(((distance - 300.0) / 45.0) ** 2)) * np.exp(-(((depth - 1.0) / 0.7) ** 2))
    mineral = np.stack([(1 - below[0]), below[0] * (1 - below[1]), below[0] * below[1]], axis=2)
    mineral /= mineral.sum(axis=2, keepdims=True)
    unknown = np.full((STEPS, THICKNESSES, 1), 0.01)
    return np.concatenate([0.99 * peat[..., None], 0.99 * (1 - peat[..., None]) * mineral, unknown], axis=2)


def odds(symbols: Sequence[str], probabilities: NDArray[np.float64]) -> list[str]:
    """Return JSON texts, symbol to probability, of every symbol of 0.005 or more."""
    rows = probabilities.reshape(-1, len(symbols))
    return [
        json.dumps({s: round(float(p), 3) for s, p in zip(symbols, row, strict=True) if p >= 0.005}) for row in rows
    ]


def evidence() -> NDArray[np.object_]:
    """Return the evidence word of each cell, shape (STEPS, THICKNESSES)."""
    distance = (np.arange(STEPS)[:, None] + 0.5) * STEP_M
    base = (np.arange(THICKNESSES)[None, :] + 1.0) * THICKNESS_M
    words = np.full((STEPS, THICKNESSES), "inferred", dtype=object)
    words[np.broadcast_to(base > BORING_DEPTH_M.max(), words.shape)] = "no data"
    for at, offset, depth in zip(BORING_DISTANCE_M, BORING_OFFSET_M, BORING_DEPTH_M, strict=True):
        if abs(offset) <= 6.0:
            words[(np.abs(distance - at) <= 5.0) & (base <= depth)] = "observed"
    return words


def draws() -> NDArray[np.int8]:
    """Return verdict codes, shape (STEPS, REALIZATIONS); imported fill is not assessed."""
    chances = np.random.default_rng(7).random((STEPS, REALIZATIONS))
    distance = (np.arange(STEPS) + 0.5) * STEP_M
    peat = 0.95 * np.exp(-(((distance - 300.0) / 60.0) ** 2))
    codes = np.where(chances < peat[:, None], 3, np.where(chances < peat[:, None] + 0.2, 2, 1)).astype(np.int8)
    codes[formation_level(distance) - 1.0 >= ground_level(distance)] = 0
    return codes


def alignment_table(name: str) -> pd.DataFrame:
    """Return the alignment layer, one row."""
    return pd.DataFrame(
        {
            "name": [name],
            "start_chainage": [chainage(0.0)],
            "length_m": [STEPS * STEP_M],
            "geometry": [shapely.linestrings(vertices())],
        }
    )


def borings_table(first: str) -> pd.DataFrame:
    """Return the borings layer: three used, one left out."""
    distance = np.array([*BORING_DISTANCE_M, 420.0])
    offset = np.array([*BORING_OFFSET_M, -118.0])
    return pd.DataFrame(
        {
            "boring": [first, "BH-2", "BH-3", "BH-4"],
            "distance_m": distance,
            "chainage": [chainage(d) for d in distance],
            "offset_m": offset,
            "side": ["left", "right", "right", "left"],
            "ground_level_m": [*ground_level(BORING_DISTANCE_M), np.nan],
            "depth_m": [*BORING_DEPTH_M, 3.0],
            "date": ["2024-03-11", "2024-03-12", None, "2024-03-14"],
            "method": ["hollow-stem auger", "hollow-stem auger", "trial pit", None],
            "status": ["used", "used", "used", "left out"],
            "reason": [None, None, None, "118 m from the alignment, farther than half_width_m 75"],
            "remarks": [None, "water at 1.2 m, rising", None, None],
            "file": "borings.csv",
            "sheet": None,
            "row_number": [2, 3, 4, 5],
            "geometry": place(distance, offset),
        }
    )


def samples_table(first: str) -> pd.DataFrame:
    """Return the samples layer: ten samples, one without a class."""
    boring = np.array([0, 0, 0, 0, 1, 1, 1, 2, 2, 2])
    top = np.array([0.5, 1.5, 3.0, 4.5, 0.6, 1.8, 3.2, 0.5, 2.0, 3.6])
    soil = np.array([1, 1, 2, 3, 0, 0, 2, 1, 2, 4])
    symbols = np.array(SOILS, dtype=object)[soil]
    groups = np.array(GROUPS, dtype=object)[soil]
    known = symbols != "n/d"
    distance, offset = BORING_DISTANCE_M[boring], BORING_OFFSET_M[boring]
    by_soil = {  # PT, CL, SM, GM, not determined
        "passing_4_75_mm_pct": [np.nan, 96.0, 82.0, 48.0, 90.0],
        "passing_2_mm_pct": [np.nan, 92.0, 74.0, 39.0, 85.0],
        "passing_0_425_mm_pct": [np.nan, 81.0, 52.0, 24.0, 70.0],
        "passing_0_075_mm_pct": [np.nan, 62.0, 21.0, 14.0, np.nan],
        "gravel_pct": [np.nan, 4.0, 18.0, 52.0, 10.0],
        "sand_pct": [np.nan, 34.0, 61.0, 34.0, np.nan],
        "fines_pct": [np.nan, 62.0, 21.0, 14.0, np.nan],
        "liquid_limit_pct": [np.nan, 34.0, np.nan, np.nan, np.nan],
        "plastic_limit_pct": [np.nan, 19.0, np.nan, np.nan, np.nan],
        "plasticity_index_pct": [np.nan, 15.0, np.nan, np.nan, np.nan],
        "is_nonplastic": [None, False, True, True, None],
        "moisture_pct": [210.0, 22.5, 14.0, 9.0, np.nan],
        "organic_pct": [64.0, np.nan, np.nan, np.nan, np.nan],
        "cbr_soaked_pct": [2.0, 4.0, 18.0, 100.0, np.nan],
        "cbr_soaked_pct_bound": ["<", None, None, ">", None],
        "group_index": [None, 7, 0, 0, None],
        "suitability": ["unsuitable", "treat", "suitable", "suitable", "not assessed"],
        "subgrade_rating": [None, "fair to poor", "good", "excellent to good", None],
    }
    return pd.DataFrame(
        {
            "boring": np.array([first, "BH-2", "BH-3"], dtype=object)[boring],
            "sample": [f"S{k}" for k in (1, 2, 3, 4, 1, 2, 3, 1, 2, 3)],
            "top_depth_m": top,
            "base_depth_m": top + 0.4,
            "distance_m": distance,
            "chainage": [chainage(d) for d in distance],
            "offset_m": offset,
            "description": [NAMES.get(s, "sandy soil, not tested for fines") for s in symbols],
            "origin": "natural",
            "specimen": np.arange(1, 11),
            **{name: np.array(values, dtype=object)[soil] for name, values in by_soil.items()},
            "uscs_symbol": np.where(known, symbols, None),
            "uscs_name": [NAMES.get(s) for s in symbols],
            "uscs_symbol_basis": np.where(known, np.where(symbols == "PT", "visual", "lab"), None),
            "uscs_symbol_reason": np.where(known, None, "fines_pct is missing"),
            "uscs_symbol_near_limit": False,
            "aashto_group": np.where(known, groups, None),
            "aashto_group_basis": np.where(known, np.where(symbols == "PT", "visual", "lab"), None),
            "aashto_group_reason": np.where(known, None, "passing 0.075 mm is missing"),
            "rule": np.where(known, "general_subgrade, fines and plasticity", None),
            "suitability_reason": np.where(known, None, "soil group is missing"),
            "status": "used",
            "lab_sheet": [f"LAB-{k:03d}" for k in range(1, 11)],
            "file": "samples.csv",
            "row_number": np.arange(2, 12),
            "geometry": place(distance, offset),
        }
    )


def subgrade_table(first: str) -> pd.DataFrame:
    """Return the subgrade layer, one line for each step."""
    start = np.arange(STEPS) * STEP_M
    middle, end = start + STEP_M / 2, start + STEP_M
    fill = np.round(formation_level(middle) - ground_level(middle), 3)
    material = np.where(fill <= 0, "natural", np.where(fill < 1.0, "mixed", "imported"))
    zone = np.clip(-fill // THICKNESS_M, 0, THICKNESSES - 2).astype(int)
    soils = soil_probabilities()
    chance = (soils[np.arange(STEPS), zone] + soils[np.arange(STEPS), zone + 1]) / 2
    best = chance.argmax(axis=1)
    natural = material != "imported"
    verdicts = draws()
    share = {name: (verdicts == code).mean(axis=1) for code, name in enumerate(VERDICTS, start=1)}
    unknown = (verdicts == 0).mean(axis=1)
    word = np.where(
        share["unsuitable"] >= 0.5,
        "unsuitable",
        np.where(
            (share["unsuitable"] < 0.1) & (unknown < 0.2),
            "suitable",
            np.where(unknown > share["treat"], "not assessed", "treat"),
        ),
    )
    line = vertices()
    nearest = np.abs(middle[:, None] - BORING_DISTANCE_M).argmin(axis=1)
    return pd.DataFrame(
        {
            "step": np.arange(1, STEPS + 1),
            "from_distance_m": start,
            "to_distance_m": end,
            "from_chainage": [chainage(d) for d in start],
            "to_chainage": [chainage(d, back=True) for d in end],
            "formation_level_m": formation_level(middle),
            "cut_fill_m": fill,
            "subgrade_material": material,
            "soil_group": np.where(natural, np.array(SOILS, dtype=object)[best], None),
            "probability": np.where(natural, np.round(chance.max(axis=1), 4), np.nan),
            "aashto_group": np.where(natural, np.array(GROUPS, dtype=object)[best], None),
            "suitability": word,
            **{f"p_{name}": share[name] for name in VERDICTS},
            "p_not_assessed": unknown,
            "cbr_basis": "not estimated",
            "evidence": evidence()[np.arange(STEPS), zone],
            "nearest_boring": np.array([first, "BH-2", "BH-3"], dtype=object)[nearest],
            "nearest_boring_m": np.abs(middle - BORING_DISTANCE_M[nearest]),
            "samples_used": np.where(natural, 10, 0),
            "rule": np.where(natural, "general_subgrade", None),
            "geometry": shapely.linestrings(np.stack([line[:-1], line[1:]], axis=1)),
        }
    )


def cells_table() -> pd.DataFrame:
    """Return the profile cells, polygons in the plane of distance and level."""
    step, layer = (grid.ravel() for grid in np.indices((STEPS, THICKNESSES)))
    soils = soil_probabilities().reshape(-1, len(SOILS))
    ground = ground_level((np.arange(STEPS) + 0.5) * STEP_M)[step]
    top, base = layer * THICKNESS_M, (layer + 1) * THICKNESS_M
    safe = np.clip(soils, 1e-12, 1.0)
    words = np.array(["unsuitable", "treat", "suitable", "suitable", "not assessed"], dtype=object)
    return pd.DataFrame(
        {
            "cell": [f"{s + 1:05d}-{k + 1:03d}" for s, k in zip(step, layer, strict=True)],
            "from_distance_m": step * STEP_M,
            "to_distance_m": (step + 1) * STEP_M,
            "top_depth_m": top,
            "base_depth_m": base,
            "top_level_m": ground - top,
            "base_level_m": ground - base,
            "soil_group": np.array(SOILS, dtype=object)[soils.argmax(axis=1)],
            "probability": np.round(soils.max(axis=1), 4),
            "entropy": np.round(-(soils * np.log(safe)).sum(axis=1) / np.log(len(SOILS)), 4),
            "evidence": evidence().ravel(),
            "suitability": words[soils.argmax(axis=1)],
            "p_unsuitable": np.round(soils[:, 0], 4),
            "astm_d2487_odds": odds(SOILS, soils),
            "aashto_m145_odds": odds(GROUPS, soils),
            "geometry": shapely.box(step * STEP_M, ground - base, (step + 1) * STEP_M, ground - top),
        }
    )


def trace_table(samples: pd.DataFrame) -> pd.DataFrame:
    """Return the trace: each step weighs every sample by distance, with a remainder for the background."""
    step, row = (grid.ravel() for grid in np.indices((STEPS, len(samples))))
    gap = np.abs((step + 0.5) * STEP_M - samples["distance_m"].to_numpy(float)[row])
    nearness = np.exp(-gap / 120.0)
    total = np.bincount(step, nearness)[step]
    columns = ["boring", "sample", "top_depth_m", "base_depth_m", "lab_sheet", "file", "row_number"]
    rows = samples[columns].iloc[row].reset_index(drop=True)
    return rows.assign(step=step + 1, weight=np.round(0.9 * nearness / total, 5))


def findings_table(first: str) -> pd.DataFrame:
    """Return three findings: a query, a value held out, a boring left out."""
    return pd.DataFrame(
        {
            "file": ["samples.csv", "samples.csv", "borings.csv"],
            "row_number": [6, 11, 5],
            "heading": ["moisture_pct", "passing_0_075_mm_pct", "x"],
            "boring": ["BH-2", "BH-3", "BH-4"],
            "sample": ["S1", "S3", None],
            "topic": ["moisture_high", "fines_missing", "far_from_line"],
            "found": ["210", "", "118 m"],
            "allowed": ["usually 0 to 100", "a number", "75 m or nearer"],
            "action": ["query", "query", "reject"],
            "severity": ["warning", "warning", "error"],
            "advice": [
                "confirm with the laboratory",
                "ask for the wash on the 0.075 mm sieve",
                f"check the coordinates against {first}",
            ],
        }
    )


def run_table() -> pd.DataFrame:
    """Return the run table."""
    values = {
        "geomap version": "0.1.0",
        "corridor half_width_m": "75",
        "sha256 borings.csv": "0" * 64,
        "sha256 samples.csv": "1" * 64,
        "profile systems": "astm_d2487, aashto_m145",
        "subgrade rules": "general_subgrade",
        "subgrade depth_m": "1.0",
        "profile step_m": "10",
        "profile thickness_m": "0.5",
        "realizations": str(REALIZATIONS),
        "seed": "1",
        "log_score": "0.412",
        "skill": "0.37",
    }
    return pd.DataFrame({"key": list(values), "value": list(values.values())})


def ground_table() -> pd.DataFrame:
    """Return levels along the line at each step boundary."""
    distance = np.arange(STEPS + 1) * STEP_M
    return pd.DataFrame(
        {
            "distance_m": distance,
            "ground_level_m": ground_level(distance),
            "formation_level_m": formation_level(distance),
            "ground_basis": "ground.csv",
        }
    )


def strata_table(first: str) -> pd.DataFrame:
    """Return the logged layers."""
    boring = np.array([0, 0, 0, 1, 1, 2, 2])
    return pd.DataFrame(
        {
            "boring": np.array([first, "BH-2", "BH-3"], dtype=object)[boring],
            "top_depth_m": [0.0, 2.1, 4.0, 0.0, 2.4, 0.0, 1.6],
            "base_depth_m": [2.1, 4.0, 5.0, 2.4, 4.5, 1.6, 4.0],
            "description": [
                *("firm brown clay", "silty sand", "dense gravel"),
                *("dark fibrous peat", "silty sand", "firm clay", "sand"),
            ],
            "visual_group": ["CL", "SM", "GM", "PT", "SM", "CL", "SM"],
            "origin": "natural",
            "unit": ["clay", "sand", "gravel", "peat", "sand", "clay", "sand"],
            "file": "strata.csv",
            "row_number": np.arange(2, 9),
            "distance_m": BORING_DISTANCE_M[boring],
            "offset_m": BORING_OFFSET_M[boring],
        }
    )


def legend_table() -> pd.DataFrame:
    """Return the legend of both systems and of the verdicts."""
    families = (
        ("astm_d2487", ("n/d", *USCS), {"n/d": "not determined", **NAMES}),
        ("aashto_m145", ("n/d", *AASHTO), {"n/d": "not determined"}),
        ("suitability", ("not assessed", *VERDICTS), {}),
    )
    rows = [
        (system, code, symbol, names.get(symbol, symbol), code if code else len(symbols))
        for system, symbols, names in families
        for code, symbol in enumerate(symbols)
    ]
    return pd.DataFrame(rows, columns=["system", "code", "symbol", "name", "order"])


def sample_results(name: str = "Otter Brook bypass", first: str = "BH-1", length_unit: str = "m") -> Results:
    """Return the invented corridor as results.

    Parameters
    ----------
    name, first
        Name of the corridor and of its first boring, so that a test can put hostile text there.
    length_unit
        Unit in which people read lengths.
    """
    samples = samples_table(first)
    frames = {
        "alignment": alignment_table(name),
        "borings": borings_table(first),
        "samples": samples,
        "subgrade": subgrade_table(first),
        "profile_cells": cells_table(),
        "trace": trace_table(samples),
        "findings": findings_table(first),
        "run": run_table(),
    }
    tables = {layer: schema.conform(frames[layer], layout) for layer, layout in schema.layers().items()}
    counts = {"table": ["borings", "samples"], "read": [4, 10], "used": [3, 10], "left_out": [1, 0]}
    return Results(
        name=name,
        use="road",
        issue="A, for review",
        crs="EPSG:32630",
        vertical_datum="EPSG:5701",
        length_unit=length_unit,
        chainage_format="0+000",
        chainage_breaks=BREAKS,
        tables={
            **tables,
            "ground": ground_table(),
            "strata": strata_table(first),
            "counts": pd.DataFrame(counts),
        },
        legend=legend_table(),
        weights=sparse.csr_array((1, 1)),
        draws=draws(),
    )
