"""The grid of steps and thicknesses, and the table of its cells."""

from __future__ import annotations

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray

from geomap.profile.verdicts import Scale, suitability

Floats = NDArray[np.float64]

LEAST_ODDS = 0.005  # symbols less likely need not be listed
SLIVER = 0.01  # of a step
ROUNDING_M = 1e-9  # levels are differences of numbers such as 0.1
BELOW_ZONE_M = 1.0  # design, section 5: the profile reaches this far below the design zone


@dataclass(frozen=True)
class Levels:
    """Levels and width at the center of each step.

    Attributes
    ----------
    ground, formation
        [m above the vertical datum]; formation is missing where there is none.
    width
        Width of the formation [m].
    """

    ground: Floats
    formation: Floats
    width: Floats


@dataclass(frozen=True)
class Sheet:
    """The profile before anything is estimated: where its cells are.

    Attributes
    ----------
    edges
        Distances of the borders of the steps [m], shape (steps + 1,).
    tops
        Depth of the top of each row [m], shape (rows,).
    thickness
        Thickness of a row [m].
    levels
        At the center of each step.
    zone_depth
        Depth of the design zone below formation [m].
    is_used
        Which cells belong to the profile, shape (steps, rows).
    """

    edges: Floats
    tops: Floats
    thickness: float
    levels: Levels
    zone_depth: float
    is_used: NDArray[np.bool_]

    @property
    def centers(self) -> Floats:
        """Distance of the center of each step [m]."""
        return (self.edges[:-1] + self.edges[1:]) / 2

    @property
    def depths(self) -> Floats:
        """Middle depth of each row below ground [m]."""
        return self.tops + self.thickness / 2

    @property
    def formation_depth(self) -> Floats:
        """Depth of formation below ground at each step [m]: negative in fill, missing where there is none."""
        return self.levels.ground - self.levels.formation

    @property
    def zone_top(self) -> Floats:
        """Depth of the top of the natural part of the design zone [m]; the ground where there is no formation."""
        return np.maximum(np.nan_to_num(self.formation_depth), 0.0)

    @property
    def zone_base(self) -> Floats:
        """Depth of the base of the design zone [m]; above the ground where the zone is all fill."""
        return np.nan_to_num(self.formation_depth) + self.zone_depth

    @property
    def in_zone(self) -> NDArray[np.bool_]:
        """Which cells belong to the design zone in natural ground.

        Those of which the zone takes half or more, and always the one that it takes most of, unless less than half
        a thickness of the zone is natural.
        """
        top, base = self.zone_top[:, None], self.zone_base[:, None]
        part = np.minimum(base, self.tops + self.thickness) - np.maximum(top, self.tops)
        half = self.thickness / 2 - ROUNDING_M
        # The first of those that it takes most of, so that a zone thinner than a cell still has one.
        first = np.arange(len(self.tops)) == part.argmax(axis=1)[:, None]
        result: NDArray[np.bool_] = ((part >= half) | first) & (base - top >= half) & self.is_used
        return result


def step_edges(length_m: float, step_m: float) -> Floats:
    """Return the borders of the steps [m]; the last step is shorter where the length is not a multiple.

    A rest of less than a hundredth of a step is added to the last one.

    Examples
    --------
    >>> step_edges(25.0, 10.0).tolist()
    [0.0, 10.0, 20.0, 25.0]
    """
    count = max(1, int(np.ceil(length_m / step_m - SLIVER)))
    return np.append(np.arange(count) * step_m, length_m)


def sheet(edges: Floats, levels: Levels, thickness_m: float, depth_m: float, zone_depth_m: float) -> Sheet:
    """Lay out the cells: every step reaches the deeper of `depth_m` and formation + design zone + 1 m.

    Parameters
    ----------
    edges
        Borders of the steps [m].
    levels
        At the center of each step.
    thickness_m, depth_m, zone_depth_m
        Thickness of a cell, least depth of the profile, depth of the design zone [m].
    """
    reach = np.maximum(depth_m, np.nan_to_num(levels.ground - levels.formation) + zone_depth_m + BELOW_ZONE_M)
    rows = np.ceil(reach / thickness_m - 1e-9).astype(int)
    tops = np.arange(rows.max()) * thickness_m
    return Sheet(edges, tops, thickness_m, levels, zone_depth_m, np.arange(rows.max()) < rows[:, None])


def odds_text(probability: Floats, symbols: Sequence[str]) -> NDArray[np.object_]:
    """Return the odds of each cell as JSON text, the likeliest symbol first.

    Every symbol of 0.005 or more is listed, and smaller ones until what is left out adds to less than 0.005, so
    the numbers add to 1 within 0.01 however many symbols there are.

    Parameters
    ----------
    probability
        Shape (cells, symbols); rows add to 1.
    symbols
        Names of the columns.

    Examples
    --------
    >>> odds_text(np.array([[0.2499, 0.7471, 0.003]]), ["CL", "CH", "SM"]).tolist()
    ['{"CH": 0.7471, "CL": 0.2499}']
    """
    rounded = np.round(probability, 4)
    # Most cells share their odds with others (a whole layer of background, say): each text is made once.
    unique, back = np.unique(rounded, axis=0, return_inverse=True)
    order = np.argsort(-unique, axis=1, kind="stable")
    ranked = np.take_along_axis(unique, order, axis=1)
    left = ranked.sum(axis=1, keepdims=True) - ranked.cumsum(axis=1) + ranked  # of this symbol and all after it
    listed = (ranked >= LEAST_ODDS) | (left >= LEAST_ODDS) & (ranked > 0)
    texts = [
        json.dumps({symbols[k]: float(p) for k, p in zip(ranks[keep], row[keep], strict=True)})
        for ranks, row, keep in zip(order, ranked, listed, strict=True)
    ]
    return np.array(texts, dtype=object)[back.ravel()]


def entropy(probability: Floats) -> Floats:
    """Return the entropy of each row, 0 where one group is sure and 1 where all columns are equally likely.

    Shannon entropy over the logarithm of the number of columns that occur at all.
    """
    classes = int((probability > 0).any(axis=0).sum())
    if classes < 2:
        return np.zeros(len(probability))
    with np.errstate(divide="ignore", invalid="ignore"):
        terms = np.where(probability > 0, -probability * np.log(probability), 0.0)
    result: Floats = np.minimum(terms.sum(axis=1) / np.log(classes), 1.0)
    return result


def cell_table(
    sheet: Sheet,
    odds: Mapping[str, tuple[Floats, Sequence[str]]],
    probability: Floats,
    scale: Scale,
    evidence: NDArray[np.object_],
) -> pd.DataFrame:
    """Return the layer ``profile_cells``.

    Parameters
    ----------
    sheet
        Where the cells are.
    odds
        By system: probability of each symbol, shape (cells, symbols), and the symbols; the first system leads.
        A symbol ``n/d`` is soil whose group is not determined.
    probability
        Probability of each verdict, shape (cells, verdicts).
    scale
        The verdicts.
    evidence
        For each cell.
    """
    rows = sheet.is_used.shape[1]
    step, row = np.divmod(np.flatnonzero(sheet.is_used), rows)
    kept = sheet.is_used.ravel()
    leading, symbols = next(iter(odds.values()))
    best = leading[kept].argmax(axis=1)
    table = pd.DataFrame({"cell": [f"{s:05d}-{r:03d}" for s, r in zip(step + 1, row + 1, strict=True)]})
    table["from_distance_m"], table["to_distance_m"] = sheet.edges[step], sheet.edges[step + 1]
    table["top_depth_m"] = sheet.tops[row]
    table["base_depth_m"] = sheet.tops[row] + sheet.thickness
    table["top_level_m"] = sheet.levels.ground[step] - table["top_depth_m"]
    table["base_level_m"] = sheet.levels.ground[step] - table["base_depth_m"]
    table["soil_group"] = np.array(symbols, dtype=object)[best]
    table["probability"] = leading[kept][np.arange(len(best)), best]
    table["entropy"] = entropy(leading)[kept]
    table["evidence"] = evidence[kept]
    table["suitability"] = suitability(probability[kept], scale)
    table["p_unsuitable"] = probability[kept][:, scale.column("unsuitable")]
    for system, (shares, names) in odds.items():
        table[f"{system}_odds"] = odds_text(shares[kept], names)
    corners = [table[n].to_numpy() for n in ("from_distance_m", "base_level_m", "to_distance_m", "top_level_m")]
    table["geometry"] = shapely.box(*corners)
    return table
