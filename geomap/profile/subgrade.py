"""One row for each step of the alignment: what lies in the design zone below formation, and whether it may stay."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
from numpy.typing import NDArray
from scipy import sparse

from geomap.profile.cells import Sheet
from geomap.profile.verdicts import Scale, suitability

Floats = NDArray[np.float64]

NATURAL, IMPORTED, MIXED = "natural", "imported", "mixed"
LEAST_WEIGHT = 0.005  # records with a smaller mean weight in the zone are neither counted nor traced
NO_CBR = "not estimated"
NO_DATA = "not assessed: no boring bears on this stretch"
NO_FORMATION = "not assessed: no formation or no ground level here"
IMPORTED_FILL = "not assessed: imported fill"


@dataclass(frozen=True)
class Zone:
    """Means over the natural cells of the design zone of each step; missing where there is none."""

    counts: NDArray[np.int64]
    in_zone: NDArray[np.bool_]

    def mean_weights(self, weights: sparse.csr_array) -> sparse.csr_array:
        """Average the weights of records, shape (steps * rows, records), over the zone: shape (steps, records)."""
        steps, rows = self.in_zone.shape
        step, row = np.nonzero(self.in_zone)
        entries = (1.0 / self.counts[step], (step, step * rows + row))
        return sparse.csr_array(sparse.csr_array(entries, shape=(steps, steps * rows)) @ weights)

    def mean(self, values: Floats) -> Floats:
        """Average `values`, shape (steps * rows, columns), over the zone: shape (steps, columns)."""
        steps, rows = self.in_zone.shape
        weighted = values.reshape(steps, rows, -1) * self.in_zone[:, :, None]
        with np.errstate(invalid="ignore", divide="ignore"):
            return weighted.sum(axis=1) / self.counts[:, None]  # type: ignore[no-any-return]


def natural_zone(sheet: Sheet) -> Zone:
    """Return the part of the design zone that lies in natural ground."""
    in_zone = sheet.in_zone
    return Zone(in_zone.sum(axis=1), in_zone)


def subgrade_material(sheet: Sheet) -> NDArray[np.object_]:
    """Return natural, imported or mixed for each step; missing where there is no formation.

    Imported: less than half a thickness of the design zone is natural. Natural: less than that is fill.
    """
    depth = sheet.formation_depth
    fill = np.clip(-np.nan_to_num(depth), 0, sheet.zone_depth)
    words = np.select(
        [np.isnan(depth), ~sheet.in_zone.any(axis=1), fill < sheet.thickness / 2],
        [np.array(w, dtype=object) for w in ("", IMPORTED, NATURAL)],
        default=np.array(MIXED, dtype=object),
    )
    words[words == ""] = None
    return words


def with_fill(
    draws: NDArray[np.int8], material: NDArray[np.object_], fill_verdict: int, not_assessed: int, scale: Scale
) -> NDArray[np.int8]:
    """Return the draws with the imported part of the zone counted in.

    Where part of the zone is fill, the worse of the natural draw and the fill's verdict governs. A step without a
    formation is not assessed.

    Parameters
    ----------
    draws
        Verdict codes of the natural part, shape (steps, realizations).
    material
        As `subgrade_material` gives it.
    fill_verdict, not_assessed
        Codes of the verdict on the imported fill, and of "not assessed".
    scale
        The verdicts.
    """
    rank = scale.rank
    governed = draws.copy()
    worse = (material == MIXED)[:, None] & (rank[fill_verdict] < rank[draws])
    governed[worse] = fill_verdict
    governed[material == IMPORTED] = fill_verdict
    governed[pd.isna(material)] = not_assessed
    return governed


def zone_evidence(evidence: NDArray[np.object_], zone: Zone) -> NDArray[np.object_]:
    """Return the evidence for each step: observed where all of its zone is, no data where more than half has none."""
    by_step = evidence.reshape(zone.in_zone.shape)
    seen = ((by_step == "observed") & zone.in_zone).sum(axis=1)
    blank = ((by_step == "no data") & zone.in_zone).sum(axis=1)
    return np.select(
        [zone.counts == 0, seen == zone.counts, blank * 2 > zone.counts],
        [np.array(w, dtype=object) for w in ("no data", "observed", "no data")],
        default=np.array("inferred", dtype=object),
    )


def nearest_hole(centers: Floats, borings: pd.DataFrame) -> tuple[NDArray[np.object_], Floats]:
    """Return the name of the nearest boring for each step, and the distance to it along and across the line [m]."""
    place = borings[["distance_m", "offset_m"]].to_numpy(float)
    gap = np.hypot(centers[:, None] - place[:, 0], place[:, 1])
    nearest = gap.argmin(axis=1)
    return borings["boring"].to_numpy(object)[nearest], gap[np.arange(len(centers)), nearest]


def subgrade_table(
    sheet: Sheet,
    zone: Zone,
    material: NDArray[np.object_],
    groups: Mapping[str, tuple[Floats, Sequence[str]]],
    probability: Floats,
    scale: Scale,
) -> pd.DataFrame:
    """Return the columns of the layer ``subgrade`` that follow from the zone; the caller adds places and evidence.

    Parameters
    ----------
    sheet, zone
        Cells, and those of the design zone.
    material
        Subgrade material of each step.
    groups
        By system, the leading one first: mean odds in the zone, shape (steps, symbols), and the symbols.
    probability
        Share of each verdict, shape (steps, verdicts).
    scale
        The verdicts.
    """
    steps = len(sheet.centers)
    table = pd.DataFrame({"step": np.arange(1, steps + 1)})
    table["from_distance_m"], table["to_distance_m"] = sheet.edges[:-1], sheet.edges[1:]
    table["formation_level_m"] = sheet.levels.formation
    table["cut_fill_m"] = sheet.levels.formation - sheet.levels.ground
    table["subgrade_material"] = material
    table["soil_group"], table["probability"] = _likeliest(next(iter(groups.values())), zone)
    if "aashto_m145" in groups:
        table["aashto_group"] = _likeliest(groups["aashto_m145"], zone)[0]
    for word in scale.words:
        table["p_" + word.replace(" ", "_")] = probability[:, scale.column(word)]
    table["suitability"] = suitability(probability, scale)
    table["cbr_basis"] = NO_CBR
    return table


def _likeliest(groups: tuple[Floats, Sequence[str]], zone: Zone) -> tuple[NDArray[np.object_], Floats]:
    odds, symbols = groups
    best = np.nan_to_num(odds).argmax(axis=1)
    names = np.array(symbols, dtype=object)[best]
    names[zone.counts == 0] = None
    share = odds[np.arange(len(odds)), best]
    return names, np.where(zone.counts == 0, np.nan, share)


def trace_table(mean_weights: sparse.csr_array, specimens: NDArray[np.int64], rows: pd.DataFrame) -> pd.DataFrame:
    """Return the layer ``trace``: the rows behind each step, greatest weight first.

    A specimen of several rows (a gradation from one sheet, limits from another) is traced to all of them; each row
    then carries the weight of the specimen.

    Parameters
    ----------
    mean_weights
        Shape (steps, records): weight averaged over the cells of the zone.
    specimens
        Number of the specimen of each record.
    rows
        Every soil row with ``specimen`` and the columns of the layer.
    """
    matrix = mean_weights.tocoo()
    keep = matrix.data >= LEAST_WEIGHT
    step, record, weight = matrix.row[keep], matrix.col[keep], matrix.data[keep]
    order = np.lexsort((record, -weight, step))
    table = pd.DataFrame({"step": step[order] + 1, "specimen": specimens[record[order]], "weight": weight[order]})
    columns = ["boring", "sample", "top_depth_m", "base_depth_m", "lab_sheet", "file", "sheet", "row_number"]
    traced = table.assign(weight=np.round(table["weight"], 4)).merge(
        rows[["specimen", *columns]], on="specimen", how="left"
    )
    return traced.sort_values("step", kind="stable").reset_index(drop=True)
