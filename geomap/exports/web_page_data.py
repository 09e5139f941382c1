"""Everything the page knows, as one plain dictionary made from the results and from nothing else.

The page draws; it does not judge. Whatever it shows stands in a table of the results, or is a length summed
over steps that share a word.
"""

from __future__ import annotations

import re
from typing import Any

import pyproj
from pyproj.exceptions import CRSError

from geomap.exports import palette
from geomap.exports.groups import first_system, symbol_names
from geomap.exports.web_boring_data import borings, findings, samples, strata
from geomap.exports.web_plan_data import plan
from geomap.exports.web_profile_data import (
    EVIDENCE,
    SUITABILITY,
    cells,
    ground,
    steps,
    symbols_present,
    trace,
)
from geomap.results import Results
from geomap.units import SPELLINGS

SYSTEM_TITLES = {
    "astm_d2487": "USCS",
    "aashto_m145": "AASHTO",
    "usda_texture": "USDA",
}
# Classes of the probability of unsuitable soil, upper bound in percent and color. The bounds at 10 and 50 are
# those at which the suitability word turns. Dark is bad; lightness alone carries the order.
RAMP = ((10, "#f4efe6"), (25, "#e8c9b5"), (50, "#cf8f8d"), (75, "#96506a"), (101, "#4a1d3c"))
_AUTHORITY_CODE = re.compile(r"[A-Za-z]+:\d+")
IMPORTED = ("#dfe2d8", "d__d")


def page_data(results: Results) -> dict[str, Any]:
    """Return the data block of the page.

    Parameters
    ----------
    results
        What the run found out.

    Returns
    -------
    dict
        Only dictionaries, lists, texts, numbers and None; lengths in meters, shares in percent.
    """
    system = first_system(results)
    symbols = symbols_present(results, system)
    logged = symbols if system == "astm_d2487" else []  # logged layers carry field symbols of that standard
    return {
        "corridor": corridor(results),
        "plan": plan(results),
        "legend": legend(results, system, symbols),
        "steps": steps(results, symbols),
        "cells": cells(results, system, symbols),
        "ground": ground(results),
        "borings": borings(results),
        "samples": samples(results, system, symbols),
        "strata": strata(results, logged),
        "trace": trace(results),
        "findings": findings(results),
        "summary": summary(results),
    }


def corridor(results: Results) -> dict[str, Any]:
    """Return what the title block and every label need."""
    per_meter = 1.0 / SPELLINGS["m"][results.length_unit]
    feet = results.chainage_format == "0+00"
    foot = results.length_unit if results.length_unit != "m" else "ft"
    zone = results.run_value("subgrade depth_m")
    return {
        "name": results.name,
        "use": results.use,
        "issue": results.issue,
        "crsName": _crs_name(results.crs),
        "verticalDatum": _crs_name(results.vertical_datum),
        "length": round(float(results.tables["alignment"]["length_m"].iloc[0]), 3),
        "unit": {"name": results.length_unit, "perMeter": per_meter},
        "chainage": {
            "breaks": [[float(at), float(value)] for at, value in results.chainage_breaks],
            "perMeter": 1.0 / SPELLINGS["m"][foot] if feet else 1.0,
            "digits": 2 if feet else 3,
        },
        "zoneDepth": float(zone) if zone else None,
        "cautions": list(results.cautions),
    }


def legend(results: Results, system: str, symbols: list[str]) -> dict[str, Any]:
    """Return the classes of each way to color the page: name, symbol, color, letter color and hatch."""
    names = symbol_names(results, system)
    return {
        "systemTitle": SYSTEM_TITLES.get(system, system),
        "groups": [_item(system, symbol, names.get(symbol, symbol), symbol) for symbol in symbols],
        "unknown": _item(system, None, "not determined", "n/d"),
        "imported": {
            "name": "imported fill",
            "symbol": "",
            "color": IMPORTED[0],
            "text": palette.BLACK,
            "hatch": palette.hatch_path(IMPORTED[1]),
        },
        "suitability": [_item("suitability", word, word) for word in SUITABILITY],
        "evidence": [_item("evidence", word, word) for word in EVIDENCE],
        "ramp": [_ramp_item(number) for number in range(len(RAMP))],
    }


def summary(results: Results) -> dict[str, Any]:
    """Return counts of rows, lengths by suitability and evidence [m], and what the estimate rests on."""
    table = results.tables["subgrade"]
    length = (table["to_distance_m"] - table["from_distance_m"]).to_numpy(float)
    suitability = table["suitability"].fillna("not assessed").to_numpy(object)
    evidence = table["evidence"].fillna("no data").to_numpy(object)
    counts = results.tables["counts"]
    return {
        "counts": {
            str(row["table"]): {"read": int(row["read"]), "used": int(row["used"]), "leftOut": int(row["left_out"])}
            for row in counts.to_dict("records")
        },
        "lengths": [
            [round(float(length[(suitability == word) & (evidence == seen)].sum()), 2) for seen in EVIDENCE]
            for word in SUITABILITY
        ],
        "statement": statement(results),
        "limits": results.run_value("verdict limits"),
        "groundLevels": results.run_value("ground levels"),
    }


def statement(results: Results) -> str:
    """Return what the run says about its estimate, or a blank text."""
    run = results.tables["run"]
    said = run.loc[run["key"].astype(str).str.startswith("estimat"), "value"]
    texts = " ".join(text.rstrip(".") + "." for text in said.dropna().astype(str) if text)
    return f"Between borings: {texts}" if texts else ""


def _item(system: str, symbol: str | None, name: str, letters: str = "") -> dict[str, Any]:
    return {
        "name": name,
        "symbol": letters,
        "color": palette.color(system, symbol),
        "text": palette.text_color(system, symbol),
        "hatch": palette.hatch_path(palette.hatch(system, symbol)),
    }


def _ramp_item(number: int) -> dict[str, Any]:
    below, fill = RAMP[number]
    least = RAMP[number - 1][0] if number else 0
    name = f"{least} to {min(below, 100)}%" if number else f"below {below}%"
    ink = max((palette.BLACK, palette.WHITE), key=lambda ink: palette.contrast(fill, ink))
    return {"name": name, "symbol": "", "color": fill, "text": ink, "hatch": "", "below": below}


def _crs_name(code: str) -> str:
    """Return the name behind an authority code, with the code, or the name in a WKT; any other text as it is."""
    is_code = _AUTHORITY_CODE.fullmatch(code) is not None
    if not is_code and "[" not in code:
        return code
    try:
        name = str(pyproj.CRS.from_user_input(code).name)
    except CRSError:
        return code
    return f"{name} ({code})" if is_code else name
