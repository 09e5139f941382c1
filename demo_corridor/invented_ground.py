"""The invented ground: line, levels, layers and soils of the demo corridor, from `invention.toml`.

Nothing here was measured. Chance comes from `random.Random.random` alone, whose sequence Python promises to keep,
through the inverse normal distribution; each sample has its own sequence, so a new hole leaves the others as they are.
"""

from __future__ import annotations

import math
import random
import tomllib
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from statistics import NormalDist
from typing import Any

import numpy as np

HERE = Path(__file__).parent
PLAN: dict[str, Any] = tomllib.loads((HERE / "invention.toml").read_text("utf-8"))
NORMAL = NormalDist()
SIEVES_MM = (75.0, 50.0, 37.5, 25.0, 19.0, 9.5, 4.75, 2.0, 0.85, 0.425, 0.25, 0.15, 0.075)  # ASTM E11 openings
HYDROMETER_MM = (0.05, 0.02, 0.005, 0.002)
PARTS = ("gravel", "sand", "silt", "clay")
SMOOTHING_M = 40.0
ROCK_M = 0.2  # a hole stops this far into rock


class Chance(random.Random):
    """A sequence of its own for each name."""

    def __init__(self, *name: object) -> None:
        super().__init__(":".join(str(part) for part in (PLAN["seed"], *name)))

    def normal(self, mean: float = 0.0, deviation: float = 1.0) -> float:
        """Return a normal draw."""
        return mean + deviation * NORMAL.inv_cdf(min(max(self.random(), 1e-9), 1 - 1e-9))

    def between(self, low: float, high: float) -> float:
        """Return a draw that is even between two limits."""
        return low + (high - low) * self.random()

    def one_of(self, items: Sequence[str]) -> str:
        """Return one item, all equally likely."""
        return items[int(self.random() * len(items))]


def wave(name: str, distance_m: float, depth_m: float = 0.0) -> float:
    """Return a smooth field of mean 0 and standard deviation near 1, the same for the same name."""
    chance, total = Chance("wave", name), 0.0
    for _ in range(6):
        along, down = chance.between(300.0, 1600.0), chance.between(3.0, 9.0)
        total += math.cos(2 * math.pi * (distance_m / along + depth_m / down + chance.random()))
    return total / math.sqrt(3.0)


def knots(rows: Sequence[Sequence[float]], distance_m: float, smoothing_m: float = SMOOTHING_M) -> float:
    """Return the value between knots, averaged over the smoothing length on either side."""
    at, values = zip(*rows, strict=True)
    return float(np.mean(np.interp(distance_m + np.linspace(-smoothing_m, smoothing_m, 9), at, values)))


# The line and the levels


def vertices() -> list[tuple[float, float]]:
    """Return the vertices of the line: one for each chord of a curve, one at each end of a straight."""
    line = PLAN["line"]
    x, y, heading = line["start_x"], line["start_y"], math.radians(line["heading_deg"])
    points = [(x, y)]
    for length, radius in line["elements"]:
        count = round(length / line["chord_m"]) if radius else 1
        step = length / count
        turn = 2 * math.asin(step / 2 / radius) if radius else 0.0
        for _ in range(count):
            heading += turn / 2
            x, y = x + step * math.sin(heading), y + step * math.cos(heading)
            heading += turn / 2
            points.append((x, y))
    return points


def beside(distance_m: float, offset_m: float) -> tuple[float, float]:
    """Return the point square to the line, right positive."""
    start = 0.0
    points = vertices()
    for (x, y), (to_x, to_y) in pairwise(points):
        length = math.hypot(to_x - x, to_y - y)
        if distance_m <= start + length:
            east, north = (to_x - x) / length, (to_y - y) / length
            along = distance_m - start
            return x + along * east + offset_m * north, y + along * north - offset_m * east
        start += length
    raise ValueError(f"{distance_m} m lies beyond the end of the line")


def line_length() -> float:
    """Return the length of the line."""
    return float(sum(length for length, _ in PLAN["line"]["elements"]))


def chainage(distance_m: float) -> str:
    """Return the label of the peg, past the chainage equation too."""
    equation = PLAN["line"]["equation"]
    passed = distance_m >= equation["at"]
    value = equation["ahead"] - equation["at"] if passed else PLAN["line"]["start_chainage"]
    kilometers, meters = divmod(value + distance_m, 1000.0)
    return f"{int(kilometers)}+{meters:03.0f}"


def ground_level(distance_m: float, offset_m: float = 0.0) -> float:
    """Return the level of the ground."""
    levels = PLAN["levels"]
    rough = levels["ground_roughness_m"] * wave("ground", 4 * distance_m)
    return float(knots(levels["ground"], distance_m, 20.0) + rough + levels["cross_slope"] * offset_m)


def formation_level(distance_m: float) -> float:
    """Return the level of the formation: straight grades joined by parabolas."""
    points = PLAN["levels"]["formation"]
    level = float(np.interp(distance_m, [p[0] for p in points], [p[1] for p in points]))
    for before, (at, height, length), after in zip(points, points[1:], points[2:], strict=False):
        into = distance_m - (at - length / 2)
        if 0 < into < length:
            first = (height - before[1]) / (at - before[0])
            second = (after[1] - height) / (after[0] - at)
            return float(height - first * length / 2 + first * into + (second - first) * into**2 / (2 * length))
    return level


# The ground


@dataclass(frozen=True)
class Hole:
    """One boring or trial pit, and the layers in it."""

    name: str
    kind: str
    distance_m: float
    offset_m: float
    depth_m: float
    layers: tuple[tuple[dict[str, Any], float, float], ...]


def thickness(unit: dict[str, Any], distance_m: float, offset_m: float) -> float:
    """Return the thickness of a unit; it changes smoothly and runs out where its knots do."""
    rows = unit["thickness"]
    if not rows[0][0] < distance_m < rows[-1][0] and 0.0 in (rows[0][1], rows[-1][1]):
        return knots(rows, distance_m) if distance_m > rows[0][0] - SMOOTHING_M else 0.0
    return max(0.0, knots(rows, distance_m) * (1 + 0.12 * wave(unit["name"], distance_m + 0.6 * offset_m)))


def layers(distance_m: float, offset_m: float, depth_m: float) -> Iterator[tuple[dict[str, Any], float, float]]:
    """Yield the layers of a hole from the top down, to the nearest 0.05 m; layers under 0.15 m are not logged."""
    top = below = 0.0
    for unit in PLAN["unit"]:
        below += thickness(unit, distance_m, offset_m)
        base = depth_m if unit["origin"] == "rock" else min(depth_m, round(below * 20) / 20)
        base = min(base, round((top + ROCK_M) * 20) / 20) if unit["origin"] == "rock" else base
        if base - top >= 0.15 - 1e-9:
            yield unit, round(top, 2), round(base, 2)
            top = base
        if base >= depth_m:
            return


def holes() -> list[Hole]:
    """Return all holes, named in order along the line."""
    found, numbers = [], {"BH": 0, "TP": 0}
    for kind, distance, offset, depth in PLAN["holes"]["rows"]:
        numbers[kind] += 1
        logged = tuple(layers(distance, offset, depth))
        found.append(Hole(f"{kind}-{numbers[kind]:02d}", kind, distance, offset, logged[-1][2], logged))
    return found


@dataclass(frozen=True)
class Soil:
    """One piece of soil as it is, before anyone describes or tests it; sizes in mm, the rest in percent."""

    unit: dict[str, Any]
    sizes: tuple[float, ...]
    passing: tuple[float, ...]
    liquid_limit: float
    plasticity_index: float  # below 0: non-plastic
    organic: float
    oven_ratio: float
    blows: float
    is_wet: bool
    depth_m: float

    def at(self, size_mm: float) -> float:
        """Return percent passing a size of the sieve or hydrometer set."""
        return dict(zip(self.sizes, self.passing, strict=True))[size_mm]

    @property
    def fines(self) -> float:
        """Percent finer than 0.075 mm."""
        return self.at(0.075)

    @property
    def gravel(self) -> float:
        """Percent coarser than 4.75 mm."""
        return 100.0 - self.at(4.75)

    @property
    def is_plastic(self) -> bool:
        """Whether the limits can be run."""
        return self.plasticity_index > 0

    def size(self, percent: float) -> float:
        """Return the size that a percentage is finer than."""
        logs = np.log10(self.sizes[::-1])
        return float(10 ** np.interp(percent, self.passing[::-1], logs))


def curve(unit: dict[str, Any], mix: np.ndarray, shifts: Sequence[float], largest_mm: float) -> np.ndarray:
    """Return percent passing every size: four log-normal parts, cut off at the largest particle."""
    parts = {**PLAN["parts"], **unit.get("parts", {})}
    share = np.zeros(len(SIEVES_MM) + len(HYDROMETER_MM))
    for weight, shift, part in zip(mix, shifts, PARTS, strict=True):
        median, spread = parts[part][0] * 10**shift, parts[part][1]
        whole = NORMAL.cdf(math.log10(largest_mm / median) / spread)
        below = [NORMAL.cdf(math.log10(d / median) / spread) / whole for d in (*SIEVES_MM, *HYDROMETER_MM)]
        share += weight * np.minimum(below, 1.0)
    return np.round(100.0 * share, 1)


def soil(hole: Hole, unit: dict[str, Any], top_m: float, base_m: float, depth_m: float) -> Soil:
    """Return the soil of a unit at one depth of one hole."""
    name, chance = unit["name"], Chance(hole.name, depth_m)
    place = (hole.distance_m + 0.6 * hole.offset_m, depth_m)
    down = (depth_m - top_m) / max(base_m - top_m, 0.1)
    mix = np.array(unit["mix"][0]) * (1 - down) + np.array(unit["mix"][1]) * down
    sway = [unit["vary"] * (0.75 * wave(f"{name} {k}", *place) + chance.normal(0, 0.45)) for k in range(4)]
    mix = mix * np.exp(sway)
    largest = (100.0 if unit.get("cobbles") else 75.0) if hole.kind == "TP" else 50.0
    drift, scatter = PLAN["parts"]["shift"]
    shifts = [drift * wave(f"{name} {p}", *place) + chance.normal(0, scatter) for p in PARTS]
    passing = curve(unit, mix / mix.sum(), shifts, largest)
    sizes = (*SIEVES_MM, *HYDROMETER_MM)
    at = dict(zip(sizes, passing, strict=True))
    index = unit["activity"] * 100 * at[0.002] / max(at[0.425], 1.0) * math.exp(chance.normal(0, 0.07)) - 1.5
    beyond = unit["beyond"] + (knots(unit["beyond_near"], hole.distance_m) if "beyond_near" in unit else 0.0)
    limit = 20.0 + index / 0.73 + beyond * math.exp(chance.normal(0, 0.25)) + chance.normal(0, 0.6)
    blows = unit["blows"][0] * (1 - down) + unit["blows"][1] * down
    return Soil(
        unit=unit,
        sizes=sizes,
        passing=tuple(float(p) for p in passing),
        liquid_limit=round(limit),
        plasticity_index=round(index) if index >= 1.5 and unit["activity"] else -1,
        organic=round(chance.between(*unit["organic"]), 1) if "organic" in unit else 0.0,
        oven_ratio=chance.between(*unit["oven_ratio"]) if "oven_ratio" in unit else 1.0,
        blows=max(1.0, blows * math.exp(0.15 * wave(f"{name} N", *place) + chance.normal(0, 0.15))),
        is_wet=depth_m > knots(PLAN["levels"]["water_depth"], hole.distance_m),
        depth_m=depth_m,
    )
