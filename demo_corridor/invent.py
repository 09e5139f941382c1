"""Invent the demo corridor: write its input files from `invention.toml`, the same files every time.

Run ``python demo_corridor/invent.py`` to write beside this file, or add a folder to write elsewhere. `invented_ground`
makes the ground; this script has it bored, described, tested and written down, and plants the faults.
"""

from __future__ import annotations

import csv
import datetime
import math
import sys
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import Any

from invented_ground import (
    HERE,
    PLAN,
    SIEVES_MM,
    Chance,
    Hole,
    Soil,
    beside,
    chainage,
    formation_level,
    ground_level,
    holes,
    knots,
    line_length,
    soil,
    vertices,
)

NO_4 = SIEVES_MM.index(4.75)
PARTICLE_DENSITY = 2.68
WATER_DENSITY_KG_M3 = 1000.0
SAMPLE_COLUMNS = (
    *("boring", "sample", "top_depth_m", "base_depth_m", "description", "visual_group", "origin", "unit", "lab_sheet"),
    *("LL", "PL", "LL oven dried", "MC (%)", "organic_pct", "organic_method"),
    *("Soaked CBR (%)", "CBR", "cbr_density_pct", "Swelling", "MDD (kg/m3)", "OMC (%)", "compaction_method"),
    *("SPT N", "unconfined_kpa"),
)


# What the crew writes down (words and estimates after ASTM D2488, percentages to the nearest 5)


def nearest_5(percent: float) -> int:
    """Return the estimate to the nearest 5 %."""
    return 5 * round(percent / 5)


def visual_group(piece: Soil) -> str:
    """Return the group symbol given by eye; D2488 gives CL or ML where a test could give CL-ML."""
    if piece.unit.get("peat"):
        return "PT"
    below_a_line = piece.plasticity_index < 0.73 * (piece.liquid_limit - 20) or piece.plasticity_index < 5
    letter = "M" if not piece.is_plastic or below_a_line else "C"
    if piece.fines >= 50:
        high = "H" if piece.liquid_limit >= 50 and piece.is_plastic else "L"
        return f"O{high}" if "oven_ratio" in piece.unit else f"{letter}{high}"
    kind = "G" if piece.gravel > (100 - piece.fines) / 2 else "S"
    fines = nearest_5(piece.fines)
    if fines >= 15:
        return f"{kind}{letter}"
    uniformity = piece.size(60) / piece.size(10)
    curvature = piece.size(30) ** 2 / piece.size(10) / piece.size(60)
    grading = "W" if uniformity >= (4 if kind == "G" else 6) and 1 <= curvature <= 3 else "P"
    return f"{kind}{grading}" + (f"-{kind}{letter}" if fines == 10 else "")


def group_words(group: str, sand: int, gravel: int) -> str:
    """Return the name that goes with a symbol given by eye."""
    if group == "PT":
        return "Peat"
    if group in ("ML", "CL", "CH", "MH", "OL", "OH"):
        noun = {"ML": "silt", "CL": "lean clay", "CH": "fat clay", "MH": "elastic silt"}.get(group, "organic clay")
        most, coarse = ("sand", "sandy") if sand >= gravel else ("gravel", "gravelly")
        if sand + gravel >= 30:
            return f"{coarse} {noun}".capitalize()
        return f"{noun} with {most}".capitalize() if sand + gravel >= 15 else noun.capitalize()
    noun, other, share = ("gravel", "sand", sand) if group[0] == "G" else ("sand", "gravel", gravel)
    words = {"W": f"well-graded {noun}", "P": f"poorly graded {noun}", "M": f"silty {noun}", "C": f"clayey {noun}"}[
        group[1]
    ]
    joined = [{"M": "silt", "C": "clay"}[group[-1]]] if "-" in group else []
    joined += [other] if share >= 15 else []
    return (words + (" with " + " and ".join(joined) if joined else "")).capitalize()


def strength_word(piece: Soil, group: str) -> str:
    """Return the consistency or density that goes with the blow count (Terzaghi and Peck's ranges)."""
    fine = ((1.5, "very soft"), (4.5, "soft"), (8.5, "medium stiff"), (15.5, "stiff"), (30.5, "very stiff"))
    coarse = ((4.5, "very loose"), (10.5, "loose"), (30.5, "medium dense"), (50.5, "dense"))
    steps, last = (fine, "hard") if group[0] in "MCOP" else (coarse, "very dense")
    return next((word for limit, word in steps if round(piece.blows) < limit), last)


def description(piece: Soil, group: str, chance: Chance) -> str:
    """Return the description in the order name, parts, color, moisture, consistency, origin."""
    fines, gravel = nearest_5(piece.fines), nearest_5(piece.gravel)
    sand = max(0, 100 - fines - gravel)
    index = piece.plasticity_index
    kind = next(
        (
            word
            for limit, word in ((1, "nonplastic"), (11, "low plasticity"), (25, "medium plasticity"))
            if index < limit
        ),
        "high plasticity",
    )
    parts = [f"{fines} % {kind} fines" if fines else "trace of fines"]
    parts += [f"{sand} % sand"] if sand else []
    parts += [f"{gravel} % gravel"] if gravel else []
    parts += ["few cobbles"] if piece.at(75.0) < 99.5 else []
    water = "wet" if piece.is_wet else "moist"
    tail = [chance.one_of(piece.unit["colors"]), water, strength_word(piece, group), piece.unit["note"]]
    if group == "PT":
        return f"Peat (PT): {', '.join(tail)}"
    return f"{group_words(group, sand, gravel)} ({group}): {', '.join(parts)}; {', '.join(tail)}"


# What the laboratory reports


def moisture(piece: Soil, chance: Chance) -> float:
    """Return the natural moisture: of plastic soil near its plastic limit, more in wet ground; of sand by its pores."""
    if piece.unit.get("peat"):
        return round(chance.between(310, 560), 0)
    if piece.organic and "oven_ratio" in piece.unit:
        return round(piece.liquid_limit * chance.between(0.82, 1.05), 1)
    matrix = piece.at(0.425) / 100
    if piece.is_plastic:
        soft = max(0.0, 1.05 - piece.blows / 11) if piece.is_wet else 0.08
        own = piece.liquid_limit - piece.plasticity_index * (1 - soft)
        own += 3.0 if piece.is_wet else -1.5
    else:
        own = 23.0 if piece.is_wet else 8.0 + 0.08 * piece.fines
    coarse = 7.0 if piece.is_wet else 2.5
    return round((own * matrix + coarse * (1 - matrix)) * math.exp(chance.normal(0, 0.06)), 1)


def compaction(piece: Soil, chance: Chance) -> tuple[float, float]:
    """Return optimum moisture and maximum dry density; 12 to 45 % of the pores are left to air, most in clean sand."""
    matrix = piece.at(0.425) / 100
    plastic_limit = piece.liquid_limit - piece.plasticity_index
    own = 3.0 + 0.65 * plastic_limit if piece.is_plastic else 12.0
    optimum = round(own * matrix + 5.5 * (1 - matrix) + chance.normal(0, 0.3), 1)
    saturation = 0.55 + 0.33 * min(1.0, piece.fines / 40) + 0.16 * min(1.0, piece.gravel / 50) * (piece.fines < 20)
    density = PARTICLE_DENSITY * WATER_DENSITY_KG_M3 / (1 + optimum / 100 * PARTICLE_DENSITY / saturation)
    return optimum, 5 * round(density / 5)


def soaked_cbr(piece: Soil, chance: Chance) -> str:
    """Return the soaked CBR after NCHRP 1-37A, appendix CC-1, lowered and with scatter; under 2 it is "<2"."""
    weighted = piece.fines / 100 * max(piece.plasticity_index, 0)
    value = 75 / (1 + 0.728 * weighted) if weighted > 0.2 else 28.09 * piece.size(60) ** 0.358
    ceiling, share = (80.0 if piece.fines < 50 else 13.0), (0.7 if piece.plasticity_index > 25 else 0.85)
    value = min(value, ceiling) * share * math.exp(chance.normal(0, 0.18))
    return "<2" if value < 2 else f"{value:.1f}" if value < 10 else f"{value:.0f}"


def swell(piece: Soil, chance: Chance) -> float:
    """Return the swell of the CBR specimen on soaking."""
    return round(max(0.0, 0.11 * (piece.fines / 100 * piece.plasticity_index - 6)) * chance.between(0.8, 1.2) + 0.1, 1)


def laboratory(piece: Soil, is_bulk: bool, chance: Chance) -> dict[str, object]:
    """Return the cells that the laboratory fills in for one sample."""
    cells: dict[str, object] = {"MC (%)": moisture(piece, chance)}
    if piece.organic:
        cells |= {"organic_pct": piece.organic, "organic_method": "ASTM D2974"}
    if piece.unit.get("peat"):
        return cells
    plastic_limit = piece.liquid_limit - piece.plasticity_index
    cells |= (
        {"LL": round(piece.liquid_limit), "PL": round(plastic_limit)} if piece.is_plastic else {"LL": "NP", "PL": "NP"}
    )
    if "oven_ratio" in piece.unit:
        cells["LL oven dried"] = round(piece.liquid_limit * piece.oven_ratio)
    if piece.fines >= 50 and piece.plasticity_index > 10 and not is_bulk and chance.random() < 0.4:
        cells["unconfined_kpa"] = round(12 * piece.blows * math.exp(chance.normal(0, 0.12)))
    if is_bulk and not piece.organic and chance.random() < 0.75:
        optimum, density = compaction(piece, chance)
        cells |= {"MDD (kg/m3)": density, "OMC (%)": optimum, "compaction_method": "ASTM D698"}
        if chance.random() < 0.85:
            cells |= {"Soaked CBR (%)": soaked_cbr(piece, chance), "cbr_density_pct": chance.one_of(("95", "95", "98"))}
            cells["Swelling"] = swell(piece, chance)
    return cells


def curve_rows(piece: Soil, chance: Chance) -> list[tuple[float, float]]:
    """Return the sizes and percentages on the sheet: from the finest sieve that all passes, or No. 4, down."""
    first = min(NO_4, max((k for k, p in enumerate(piece.passing) if p >= 100.0), default=0))
    needs_d10 = 10 <= piece.fines <= 12.5  # without D10 a dual symbol cannot be settled
    has_hydrometer = (piece.fines > 35 or needs_d10) and chance.random() < 0.7
    last = len(piece.sizes) if has_hydrometer else len(SIEVES_MM)
    return list(zip(piece.sizes[first:last], piece.passing[first:last], strict=True))


# The tables


def sample_places(hole: Hole) -> Iterator[tuple[dict[str, Any], float, float, float, float]]:
    """Yield unit, top and base of the layer, top and base of the sample; every layer of 0.3 m or more has one."""
    chance = Chance("places", hole.name)
    for unit, top, base in hole.layers:
        is_topsoil = unit["origin"] == "topsoil"
        if unit["origin"] == "rock" or base - top < (0.2 if is_topsoil else 0.3):
            continue
        if is_topsoil and chance.random() > 0.35:
            continue
        spacing = 0.85 if top < 3.5 else 1.1
        count = max(1, round((base - top) / spacing))
        for k in range(count):
            room = (base - top) / count
            long = min(0.45 if hole.kind == "BH" else 0.4, math.floor(room * 20) / 20)
            start = round((top + room * k + (room - long) * 0.5) * 20) / 20
            yield unit, top, base, round(start, 2), round(min(start + long, base), 2)


def is_taken_in_bulk(hole: Hole, unit: dict[str, Any], depth_m: float) -> bool:
    """Return whether the crew bags auger cuttings here: near formation, or near the ground below a fill."""
    into_m = depth_m - max(0.4, ground_level(hole.distance_m) - formation_level(hole.distance_m))
    wanted = -0.3 < into_m < 0.9 and unit["origin"] != "topsoil" and "organic" not in unit
    return wanted and Chance("bulk", hole.name, depth_m).random() < 0.75


def sample_tables(found: Sequence[Hole]) -> tuple[list[dict[str, object]], list[dict[str, object]]]:
    """Return the rows of samples and of gradations."""
    samples: list[dict[str, object]] = []
    gradations: list[dict[str, object]] = []
    for hole in found:
        for number, (unit, layer_top, layer_base, top, base) in enumerate(sample_places(hole), 1):
            depth = (top + base) / 2
            piece, chance = soil(hole, unit, layer_top, layer_base, depth), Chance("test", hole.name, depth)
            group = visual_group(piece)
            is_bulk = hole.kind == "TP" or is_taken_in_bulk(hole, unit, depth)
            key = {"boring": hole.name, "sample": f"{'B' if is_bulk else 'S'}{number}"}
            row = key | {"top_depth_m": top, "base_depth_m": base, "visual_group": group, "origin": unit["origin"]}
            row |= {"unit": unit["name"], "description": description(piece, group, chance)}
            if not is_bulk and unit["origin"] != "topsoil":
                row["SPT N"] = ">50" if piece.blows > 50 else round(piece.blows)
            if chance.random() < 0.84 or piece.organic > 5:
                row |= laboratory(piece, is_bulk, chance)
                row["lab_sheet"] = f"LS-{hole.name[:2]}{hole.name[3:]}-{number:02d}"
                if not unit.get("peat"):
                    gradations += [key | {"size_mm": d, "passing_pct": p} for d, p in curve_rows(piece, chance)]
            samples.append(row)
    return samples, gradations


def boring_rows(found: Sequence[Hole]) -> list[dict[str, object]]:
    """Return the rows of borings."""
    rows: list[dict[str, object]] = []
    day = datetime.date.fromisoformat(PLAN["holes"]["first_day"])
    for number, hole in enumerate(found):
        x, y = beside(hole.distance_m, hole.offset_m)
        weeks, day_of_week = divmod(number // 2, 5)
        ends_in_rock = hole.layers[-1][0]["origin"] == "rock"
        rows.append(
            {
                "boring": hole.name,
                "x": f"{x:.2f}",
                "y": f"{y:.2f}",
                "ground_level_m": f"{ground_level(hole.distance_m, hole.offset_m):.2f}",
                "depth_m": f"{hole.depth_m:.2f}",
                "date": (day + datetime.timedelta(days=7 * weeks + day_of_week)).isoformat(),
                "method": "trial pit, backhoe" if hole.kind == "TP" else "hollow-stem auger with SPT",
                "remarks": "refusal on rock" if ends_in_rock else "",
            }
        )
    return rows


def stratum_rows(found: Sequence[Hole]) -> Iterator[dict[str, object]]:
    """Yield the rows of strata: each layer described from its middle."""
    for hole in found:
        for unit, top, base in hole.layers:
            row = {"boring": hole.name, "top_depth_m": top, "base_depth_m": base, "origin": unit["origin"]}
            row |= {"unit": unit["name"], "description": unit["note"], "visual_group": ""}
            if unit["origin"] != "rock":
                piece = soil(hole, unit, top, base, (top + base) / 2)
                row["visual_group"] = visual_group(piece)
                words = description(piece, str(row["visual_group"]), Chance("log", hole.name, top))
                name, rest = words.split(": ", 1)
                row["description"] = f"{name}: {rest.split('; ', 1)[1]}" if "% " in rest else words
            yield row


def along(step_m: float) -> list[float]:
    """Return distances from end to end."""
    return [step_m * k for k in range(round(line_length() / step_m) + 1)]


def tables() -> dict[str, tuple[Sequence[str], list[dict[str, object]]]]:
    """Return every file: its headings and rows."""
    found, levels = holes(), PLAN["levels"]
    samples, gradations = sample_tables(found)
    return {
        "alignment.csv": (("x", "y"), [{"x": f"{x:.3f}", "y": f"{y:.3f}"} for x, y in vertices()]),
        "borings.csv": (
            ("boring", "x", "y", "ground_level_m", "depth_m", "date", "method", "remarks"),
            boring_rows(found),
        ),
        "samples.csv": (SAMPLE_COLUMNS, samples),
        "gradations.csv": (("boring", "sample", "size_mm", "passing_pct"), gradations),
        "strata.csv": (
            ("boring", "top_depth_m", "base_depth_m", "description", "visual_group", "origin", "unit"),
            list(stratum_rows(found)),
        ),
        "ground.csv": (
            ("distance_m", "level_m"),
            [{"distance_m": f"{d:.0f}", "level_m": f"{ground_level(d):.2f}"} for d in along(levels["ground_step_m"])],
        ),
        "formation.csv": (
            ("chainage", "level_m", "width_m"),
            [
                {
                    "chainage": chainage(d),
                    "level_m": f"{formation_level(d):.3f}",
                    "width_m": f"{knots(levels['width'], d, 0.0):.1f}",
                }
                for d in along(levels["formation_step_m"])
            ],
        ),
    }


def plant(files: dict[str, tuple[Sequence[str], list[dict[str, object]]]]) -> None:
    """Put the faults of `invention.toml` into the tables."""
    for fault in PLAN["fault"]:
        rows = files[fault["file"]][1]
        picked = [r for r in rows if all(str(r.get(k)) == str(v) for k, v in fault["where"].items())]
        if len(picked) != 1:
            raise ValueError(f"{fault['where']} names {len(picked)} rows of {fault['file']}; a fault needs one")
        if fault.get("add"):
            rows.insert(rows.index(picked[0]) + 1, dict(fault["set"]))
        else:
            picked[0].update(fault["set"])


def write(folder: Path) -> Iterable[Path]:
    """Write every table as CSV and yield the files."""
    files = tables()
    plant(files)
    for name, (headings, rows) in files.items():
        with (folder / name).open("w", encoding="utf-8", newline="") as stream:
            table = csv.DictWriter(stream, headings, lineterminator="\n")
            table.writeheader()
            table.writerows(rows)
        yield folder / name


if __name__ == "__main__":
    for written in write(Path(sys.argv[1]) if len(sys.argv) > 1 else HERE):
        sys.stdout.write(f"{written.name}\n")
