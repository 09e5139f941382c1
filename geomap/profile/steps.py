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
from geomap.profile.verdicts import Scale, governing_rule

Floats = NDArray[np.float64]


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
    """What the corridor file says of imported material: its group or a blank, verdict code, and the rule or reason."""

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
        Verdict codes of the natural part of the design zone, shape (steps, realizations).
    fill
        Imported material.
    holes
        Borings that are used: ``boring``, ``distance_m``, ``offset_m``.
    scale
        The verdicts.
    """
    zone = subgrade.natural_zone(sheet)
    material = subgrade.subgrade_material(sheet)
    unknown = scale.column("not assessed")
    probability = subgrade.verdict_shares(draws, material, fill.verdict, unknown, scale)
    groups = {system: (zone.mean(odds), symbols) for system, (odds, symbols) in judged.odds.items()}
    table = subgrade.subgrade_table(sheet, zone, material, groups, probability, scale)
    table["evidence"] = subgrade.zone_evidence(judged.evidence, zone)
    if len(holes):
        table["nearest_boring"], table["nearest_boring_m"] = subgrade.nearest_hole(sheet.centers, holes)
    counted = zone.mean_weights(judged.weights) >= subgrade.LEAST_WEIGHT
    table["samples_used"] = np.asarray(counted.sum(axis=1)).ravel()
    names, verdict_of_rule, shares = judged.rules
    behind = np.nan_to_num(zone.mean(shares))
    table["rule"] = governing_rule(names, verdict_of_rule, behind, table["suitability"].to_numpy(object), scale)
    return _with_fill(table, fill)


def _with_fill(table: pd.DataFrame, fill: Fill) -> pd.DataFrame:
    """Say of each step in embankment what the fill is, and of each without formation that it is not judged."""
    imported = table["subgrade_material"] == subgrade.IMPORTED
    hidden = (
        (table["subgrade_material"] == subgrade.MIXED) & (table["suitability"] == "not assessed") & (not fill.group)
    )
    table["rule"] = table["rule"].mask(imported | hidden, fill.rule)
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
