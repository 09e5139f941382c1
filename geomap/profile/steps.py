"""The layer ``subgrade``: what the cells of the design zone say about each step of the alignment."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy import sparse

from geomap.profile import subgrade
from geomap.profile.cells import Sheet
from geomap.profile.verdicts import Scale, governing_rule, shares

Floats = NDArray[np.float64]

HALF = 0.5  # of the draws: from here on the fill is what decides a mixed step


@dataclass(frozen=True)
class Judged:
    """The judged ensemble, cell by cell in the order of the sheet.

    Attributes
    ----------
    odds
        By system, the leading one first: probability of each symbol, shape (cells, symbols), and the symbols.
    probability
        Probability of each verdict, shape (cells, verdicts).
    rules
        For each rule its name, its verdict in a word; and the share of the soil it decided, shape (cells, rules).
    evidence
        observed, inferred or no data.
    weights
        Shares of the records, shape (cells, records), sparse.
    """

    odds: Mapping[str, tuple[Floats, Sequence[str]]]
    probability: Floats
    rules: tuple[Sequence[str], Sequence[str], Floats]
    evidence: NDArray[np.object_]
    weights: sparse.csr_array


@dataclass(frozen=True)
class Fill:
    """Imported material: its group in the leading system or a blank, its verdict code, and the rule or reason."""

    group: str
    verdict: int
    rule: str


def step_table(
    sheet: Sheet, judged: Judged, draws: NDArray[np.int8], fill: Fill, holes: pd.DataFrame, scale: Scale
) -> pd.DataFrame:
    """Return the layer ``subgrade`` but for chainage labels and geometry.

    Parameters
    ----------
    sheet, judged
        The cells and what is known about them.
    draws
        Verdict codes of the design zone, fill counted in, shape (steps, realizations).
    fill
        Imported material.
    holes
        Borings that are used: ``boring``, ``distance_m``, ``offset_m``.
    scale
        The verdicts.
    """
    zone = subgrade.natural_zone(sheet)
    material = subgrade.subgrade_material(sheet)
    probability = shares(draws, len(scale.words))
    groups = {system: (zone.mean(odds), symbols) for system, (odds, symbols) in judged.odds.items()}
    table = subgrade.subgrade_table(sheet, zone, material, groups, probability, scale)
    table["evidence"] = subgrade.zone_evidence(judged.evidence, zone)
    if len(holes):
        table["nearest_boring"], table["nearest_boring_m"] = subgrade.nearest_hole(sheet.centers, holes)
    counted = zone.mean_weights(judged.weights) >= subgrade.LEAST_WEIGHT
    table["samples_used"] = np.asarray(counted.sum(axis=1)).ravel()
    names, verdict_of_rule, of_rules = judged.rules
    behind = np.nan_to_num(zone.mean(of_rules))
    table["rule"] = governing_rule(names, verdict_of_rule, behind, table["suitability"].to_numpy(object), scale)
    table = _with_reason(table, scale)
    governs = (draws == fill.verdict).mean(axis=1) >= HALF
    return _with_fill(table, fill, governs & (fill.verdict != scale.worst_first[-1]))


def _with_reason(table: pd.DataFrame, scale: Scale) -> pd.DataFrame:
    """Call no step suitable, or anything else, without data; and say why a mostly suitable step is not called so."""
    blank = (table["evidence"] == "no data") & table["subgrade_material"].isin([subgrade.NATURAL, subgrade.MIXED])
    doubted = (table["suitability"] == "treat") & (table["p_treat"] < table["p_suitable"])
    allowed = f" where {scale.suitable_p_unsuitable:g} is allowed, most of it by "
    why = "p_unsuitable " + table["p_unsuitable"].map("{:.2f}".format) + allowed + table["rule"].astype(str)
    table["rule"] = table["rule"].mask(doubted, why).mask(blank, subgrade.NO_DATA)
    table["suitability"] = table["suitability"].mask(blank, "not assessed")
    return table


def _with_fill(table: pd.DataFrame, fill: Fill, governs: NDArray[np.bool_]) -> pd.DataFrame:
    """Say of each step in embankment what the fill is, and of each without levels that it is not judged."""
    imported = table["subgrade_material"] == subgrade.IMPORTED
    by_fill = imported | ((table["subgrade_material"] == subgrade.MIXED) & governs)
    table["rule"] = table["rule"].mask(by_fill, fill.rule)
    table["rule"] = table["rule"].mask(table["subgrade_material"].isna(), subgrade.NO_FORMATION)
    table["soil_group"] = table["soil_group"].mask(imported, fill.group or None)
    if "aashto_group" in table:
        table["aashto_group"] = table["aashto_group"].mask(imported, None)
    return table


def trace_zone(sheet: Sheet) -> subgrade.Zone:
    """Return the cells whose records are traced: the design zone, and under an embankment as much natural ground."""
    zone = subgrade.natural_zone(sheet)
    beneath = (sheet.depths < sheet.zone_depth) & sheet.is_used
    in_zone = np.where((zone.counts == 0)[:, None], beneath, zone.in_zone)
    return subgrade.Zone(in_zone.sum(axis=1), in_zone)
