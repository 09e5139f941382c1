"""A constructed corridor of any length for the page: as many steps, layers and borings as a test asks for.

Nothing here was measured. Soil is a made-up succession with a peat hollow and a fat-clay stretch; the numbers only
have to look like a corridor in size and variety.
"""

from __future__ import annotations

import dataclasses

import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray
from scipy import sparse

from geomap.results import Results
from geomap.tables import schema
from tests.unit.exports.sample import AASHTO, legend_table, odds

SOILS = ("PT", "CH", "CL", "ML", "SM", "SP-SM", "GM", "n/d")
GROUPS = ("A-8", "A-7-6", "A-6", "A-4", "A-2-4", "A-3", "A-1-b", "n/d")
NAMES = {
    "PT": "peat",
    "CH": "fat clay",
    "CL": "sandy lean clay",
    "ML": "sandy silt",
    "SM": "silty sand with gravel",
    "SP-SM": "poorly graded sand with silt",
    "GM": "silty gravel with sand",
}
VERDICT = np.array(["unsuitable", "unsuitable", "treat", "treat", "suitable", "suitable", "suitable", "not assessed"])
TYPICAL = {  # fines, liquid limit, plasticity index, moisture, soaked CBR
    "PT": (np.nan, np.nan, np.nan, 240.0, np.nan),
    "CH": (88.0, 62.0, 36.0, 34.0, 2.0),
    "CL": (64.0, 36.0, 16.0, 21.0, 4.0),
    "ML": (58.0, 30.0, 5.0, 19.0, 6.0),
    "SM": (22.0, np.nan, np.nan, 12.0, 18.0),
    "SP-SM": (8.0, np.nan, np.nan, 7.0, 20.0),
    "GM": (15.0, np.nan, np.nan, 8.0, 45.0),
    "n/d": (np.nan, np.nan, np.nan, np.nan, np.nan),
}
FORMATION_CUT_M, ZONE_M = 1.5, 1.0


@dataclasses.dataclass(frozen=True)
class Size:
    """How large the corridor is."""

    steps: int = 800
    thicknesses: int = 24
    borings: int = 40
    step_m: float = 10.0
    thickness_m: float = 0.25

    @property
    def length_m(self) -> float:
        """Length along the line."""
        return self.steps * self.step_m

    @property
    def middles(self) -> NDArray[np.float64]:
        """Distance of the middle of each step."""
        return (np.arange(self.steps) + 0.5) * self.step_m

    @property
    def holes(self) -> NDArray[np.float64]:
        """Distance of each boring: spaced unevenly."""
        even = (np.arange(self.borings) + 0.5) * self.length_m / self.borings
        return np.round(even + 0.3 * self.length_m / self.borings * np.sin(np.arange(self.borings) * 2.3), 1)


def ground_level(distance: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return rolling ground."""
    return np.round(78.0 + 5.0 * np.sin(distance / 1100.0) + 1.6 * np.sin(distance / 260.0), 3)


def formation_level(distance: NDArray[np.float64]) -> NDArray[np.float64]:
    """Return a grade that cuts the crests and fills the hollows."""
    return np.round(77.2 + 4.0 * np.sin(distance / 1100.0), 3)


def chances(size: Size) -> NDArray[np.float64]:
    """Return the probability of each of SOILS, shape (steps, thicknesses, soils)."""
    distance = size.middles[:, None]
    depth = (np.arange(size.thicknesses)[None, :] + 0.5) * size.thickness_m
    gap = np.abs(distance[..., None] - size.holes).min(axis=2)
    blur = 0.12 + gap / 140.0

    def below(base: NDArray[np.float64]) -> NDArray[np.float64]:
        return 1 / (1 + np.exp(np.clip(-(depth - base) / blur, -50, 50)))

    wave = np.sin(distance / 370.0)
    clay, sand = below(1.1 + 0.5 * wave), below(3.2 + 1.1 * np.sin(distance / 610.0))
    gravel = below(4.6 + 0.8 * wave)
    fat = np.clip(np.exp(-(((distance - 0.62 * size.length_m) / 420.0) ** 2)) * 1.2, 0, 0.97)
    peat = np.exp(-(((distance - 0.3 * size.length_m) / 110.0) ** 2)) * np.exp(-(((depth - 1.0) / 1.1) ** 2))
    silt_share = 0.5 + 0.45 * np.sin(distance / 800.0)
    lean = clay * (1 - sand)
    parts = np.stack(
        [
            np.zeros_like(depth * distance),
            lean * fat,
            lean * (1 - fat) + 0.15 * (1 - clay),
            (1 - clay) * silt_share,
            (1 - clay) * (1 - silt_share) + 0.6 * sand * (1 - gravel),
            0.4 * sand * (1 - gravel),
            sand * gravel,
        ],
        axis=2,
    )
    parts *= (1 - peat)[..., None] / parts.sum(axis=2, keepdims=True)
    parts[..., 0] = peat
    return np.concatenate([0.99 * parts, np.full((*parts.shape[:2], 1), 0.01)], axis=2)


def line(size: Size) -> NDArray[np.float64]:
    """Return the vertices, one step apart."""
    heading = 0.35 + 0.55 * np.sin(size.middles / 1700.0) + 0.2 * np.sin(size.middles / 500.0)
    moves = size.step_m * np.column_stack([np.cos(heading), np.sin(heading)])
    return np.cumsum(np.vstack([[431_000.0, 5_623_000.0], moves]), axis=0)


def evidence(size: Size) -> NDArray[np.object_]:
    """Return the evidence of each cell, shape (steps, thicknesses)."""
    gap = np.abs(size.middles[:, None] - size.holes).min(axis=1)[:, None]
    base = (np.arange(size.thicknesses)[None, :] + 1.0) * size.thickness_m
    near = np.broadcast_to(gap <= 5.0, (size.steps, size.thicknesses))
    words = np.where(near, np.array("observed", dtype=object), np.array("inferred", dtype=object))
    words[(base > 4.0) & (gap > 75.0)] = "no data"
    return words


def cells_table(size: Size) -> pd.DataFrame:
    """Return the profile cells."""
    step, layer = (grid.ravel() for grid in np.indices((size.steps, size.thicknesses)))
    soils = chances(size).reshape(-1, len(SOILS))
    ground = ground_level(size.middles)[step]
    best = soils.argmax(axis=1)
    return pd.DataFrame(
        {
            "cell": [f"{s + 1}-{k + 1}" for s, k in zip(step, layer, strict=True)],
            "from_distance_m": step * size.step_m,
            "to_distance_m": (step + 1) * size.step_m,
            "top_depth_m": layer * size.thickness_m,
            "base_depth_m": (layer + 1) * size.thickness_m,
            "top_level_m": ground - layer * size.thickness_m,
            "base_level_m": ground - (layer + 1) * size.thickness_m,
            "soil_group": np.array(SOILS, dtype=object)[best],
            "probability": soils.max(axis=1),
            "evidence": evidence(size).ravel(),
            "suitability": VERDICT[best],
            "p_unsuitable": soils[:, :2].sum(axis=1),
            "astm_d2487_odds": odds(SOILS, soils),
            "aashto_m145_odds": odds(GROUPS, soils),
        }
    )


def subgrade_table(size: Size) -> pd.DataFrame:
    """Return one row for each step."""
    start = np.arange(size.steps) * size.step_m
    fill = np.round(formation_level(size.middles) - ground_level(size.middles), 3)
    top = np.clip((-fill / size.thickness_m).astype(int), 0, size.thicknesses - 4)
    soils = chances(size)
    zone = np.mean([soils[np.arange(size.steps), top + k] for k in range(4)], axis=0)
    material = np.where(fill <= 0.1, "natural", np.where(fill < ZONE_M, "mixed", "imported"))
    buried = material == "imported"
    p_unsuitable = np.clip(zone[:, :2].sum(axis=1) * 1.3, 0, 1)
    p_treat = (1 - p_unsuitable) * zone[:, 2:4].sum(axis=1)
    shares = np.stack([1 - p_unsuitable - p_treat, p_treat, p_unsuitable, np.zeros(size.steps)], axis=1)
    shares[buried] = [0, 0, 0, 1]
    word = np.select(
        [buried, shares[:, 2] >= 0.5, (shares[:, 2] < 0.1) & (shares[:, 0] > shares[:, 1])],
        ["not assessed", "unsuitable", "suitable"],
        "treat",
    )
    nearest = np.abs(size.middles[:, None] - size.holes).argmin(axis=1)
    best = zone.argmax(axis=1)
    return pd.DataFrame(
        {
            "step": np.arange(1, size.steps + 1),
            "from_distance_m": start,
            "to_distance_m": start + size.step_m,
            "formation_level_m": formation_level(size.middles),
            "cut_fill_m": fill,
            "subgrade_material": material,
            "soil_group": np.where(buried, None, np.array(SOILS, dtype=object)[best]),
            "probability": np.where(buried, np.nan, zone.max(axis=1)),
            "aashto_group": np.where(buried, None, np.array(GROUPS, dtype=object)[best]),
            "suitability": word,
            "p_suitable": shares[:, 0],
            "p_treat": shares[:, 1],
            "p_unsuitable": shares[:, 2],
            "p_not_assessed": shares[:, 3],
            "cbr_basis": "not estimated",
            "evidence": evidence(size)[np.arange(size.steps), top],
            "nearest_boring": [f"BH-{n + 1:02d}" for n in nearest],
            "nearest_boring_m": np.abs(size.middles - size.holes[nearest]),
            "samples_used": 9,
            "rule": "general_subgrade, 2: fines and plasticity",
            "geometry": shapely.linestrings(np.stack([line(size)[:-1], line(size)[1:]], axis=1)),
        }
    )


def borings_and_samples(size: Size) -> tuple[pd.DataFrame, pd.DataFrame, pd.DataFrame]:
    """Return borings (the last one left out), five or six samples in each, and logged layers."""
    names = [f"BH-{n + 1:02d}" for n in range(size.borings)]
    offset = np.round(9.0 * np.sin(np.arange(size.borings) * 1.7), 1)
    depth = np.round(4.5 + 1.5 * np.cos(np.arange(size.borings)), 1)
    vertices = line(size)
    at = np.minimum((size.holes // size.step_m).astype(int), size.steps - 1)
    places = shapely.points(vertices[at] + np.column_stack([np.zeros(size.borings), offset]))
    used = np.arange(size.borings) < size.borings - 1
    borings = pd.DataFrame(
        {
            "boring": names,
            "distance_m": size.holes,
            "offset_m": offset,
            "side": np.where(offset < 0, "left", "right"),
            "ground_level_m": np.round(ground_level(size.holes) + 0.05 * offset, 2),
            "depth_m": depth,
            "date": "2024-05-14",
            "method": np.where(np.arange(size.borings) % 5 == 4, "trial pit", "hollow-stem auger"),
            "status": np.where(used, "used", "left out"),
            "reason": np.where(used, None, "farther than half_width_m"),
            "file": "borings.csv",
            "row_number": np.arange(size.borings) + 2,
            "geometry": places,
        }
    )
    tops = np.array([0.3, 0.9, 1.6, 2.4, 3.4, 4.4])
    hole, number = (grid.ravel() for grid in np.indices((size.borings, len(tops))))
    keep = tops[number] + 0.3 <= depth[hole]
    hole, top = hole[keep], tops[number[keep]]
    soils = chances(size)[at[hole], np.minimum((top / size.thickness_m).astype(int), size.thicknesses - 1)]
    symbol = np.array(SOILS, dtype=object)[soils.argmax(axis=1)]
    values = np.array([TYPICAL[s] for s in symbol])
    samples = pd.DataFrame(
        {
            "boring": np.array(names, dtype=object)[hole],
            "sample": [f"S{k}" for k in number[keep] + 1],
            "top_depth_m": top,
            "base_depth_m": top + 0.3,
            "description": [NAMES.get(s) for s in symbol],
            "fines_pct": values[:, 0],
            "liquid_limit_pct": values[:, 1],
            "plasticity_index_pct": values[:, 2],
            "moisture_pct": values[:, 3],
            "cbr_soaked_pct": values[:, 4],
            "is_nonplastic": np.isin(symbol, ["SM", "SP-SM", "GM"]),
            "uscs_symbol": symbol,
            "uscs_name": [NAMES.get(s) for s in symbol],
            "uscs_symbol_basis": "lab",
            "uscs_symbol_near_limit": number[keep] % 7 == 3,
            "aashto_group": [GROUPS[SOILS.index(s)] for s in symbol],
            "group_index": 4,
            "suitability": VERDICT[[SOILS.index(s) for s in symbol]],
            "rule": "general_subgrade, 2: fines and plasticity",
            "status": np.where(used[hole], "used", "left out"),
            "reason": np.where(used[hole], None, "its boring is left out"),
            "lab_sheet": [f"LAB-24-{k + 101:04d}" for k in range(len(hole))],
            "file": "samples.csv",
            "row_number": np.arange(len(hole)) + 2,
        }
    )
    first = samples.groupby("boring", sort=False)["uscs_symbol"].first()
    strata = pd.DataFrame(
        {
            "boring": np.repeat(names, 3),
            "top_depth_m": np.tile([0.0, 0.25, 2.8], size.borings),
            "base_depth_m": np.column_stack([np.full(size.borings, 0.25), np.full(size.borings, 2.8), depth]).ravel(),
            "description": np.tile(["topsoil", "as sampled", "medium dense sand"], size.borings),
            "visual_group": np.column_stack(
                [np.full(size.borings, None), first[names], np.full(size.borings, "SM")]
            ).ravel(),
            "origin": np.tile(["topsoil", "natural", "natural"], size.borings),
            "unit": np.tile(["topsoil", "upper", "lower"], size.borings),
            "distance_m": np.repeat(size.holes, 3),
            "offset_m": np.repeat(offset, 3),
        }
    )
    return borings, samples, strata


def trace_table(size: Size, samples: pd.DataFrame, borings: pd.DataFrame) -> pd.DataFrame:
    """Return the samples of the three nearest used borings for each step."""
    used = np.flatnonzero(borings["status"] == "used")
    order = np.abs(size.middles[:, None] - size.holes[used]).argsort(axis=1)[:, :3]
    pairs = pd.DataFrame(
        {
            "step": np.repeat(np.arange(1, size.steps + 1), order.shape[1]),
            "boring": borings["boring"].to_numpy(object)[used[order.ravel()]],
            "share": np.tile([0.5, 0.25, 0.15], size.steps)[: order.size],
        }
    )
    columns = ["boring", "sample", "top_depth_m", "base_depth_m", "lab_sheet", "file", "row_number"]
    rows = pairs.merge(samples[columns], on="boring")
    count = rows.groupby(["step", "boring"])["sample"].transform("size")
    return rows.assign(weight=np.round(rows["share"] / count, 4))


def large_results(size: Size | None = None, name: str = "Stand Heath link") -> Results:
    """Return the constructed corridor as results."""
    size = size or Size()
    borings, samples, strata = borings_and_samples(size)
    edges = np.arange(size.steps + 1) * size.step_m
    findings = pd.DataFrame(
        {
            "file": "samples.csv",
            "row_number": np.arange(24) + 2,
            "heading": "liquid_limit_pct",
            "boring": np.resize(borings["boring"].to_numpy(object), 24),
            "sample": "S2",
            "topic": "plastic_above_liquid",
            "found": "LL 31, PL 34",
            "allowed": "PL not above LL",
            "action": np.resize(["query", "convert", "reject"], 24),
            "severity": np.resize(["warning", "note", "error"], 24),
            "advice": "ask the laboratory for the work sheet",
        }
    )
    run = {
        "subgrade depth_m": str(ZONE_M),
        "estimation": "Ranges are fixed defaults: 200 m along the line, 2 m in depth",
    }
    frames = {
        "alignment": pd.DataFrame(
            {"name": [name], "length_m": [size.length_m], "geometry": [shapely.linestrings(line(size))]}
        ),
        "borings": borings,
        "samples": samples,
        "subgrade": subgrade_table(size),
        "profile_cells": cells_table(size),
        "trace": trace_table(size, samples, borings),
        "findings": findings,
        "run": pd.DataFrame({"key": list(run), "value": list(run.values())}),
    }
    tables = {layer: schema.conform(frames[layer], layout) for layer, layout in schema.layers().items()}
    counts = {
        "table": ["borings", "samples"],
        "read": [len(borings), len(samples)],
        "used": [len(borings) - 1, int((samples["status"] == "used").sum())],
        "left_out": [1, int((samples["status"] != "used").sum())],
    }
    extra = {
        "ground": pd.DataFrame(
            {
                "distance_m": edges,
                "ground_level_m": ground_level(edges),
                "formation_level_m": formation_level(edges),
                "ground_basis": "ground.csv",
            }
        ),
        "strata": strata,
        "counts": pd.DataFrame(counts),
    }
    return Results(
        name=name,
        use="road",
        issue="B, for review",
        crs="EPSG:32630",
        vertical_datum="EPSG:5701",
        length_unit="m",
        chainage_format="0+000",
        chainage_breaks=((0.0, 0.0), (0.41 * size.length_m, 0.41 * size.length_m + 50.0)),
        tables={**tables, **extra},
        legend=legend_table(),
        draws=np.zeros((size.steps, 0), dtype=np.int8),
        weights=sparse.csr_array((size.steps * size.thicknesses, 0)),
    )


assert set(GROUPS) - {"n/d"} <= set(AASHTO)
