"""Ground, formation and width at places along the line, from whatever tables a corridor has."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.alignment.chainage import Chainage
from geomap.alignment.levels import LevelTable, formation_level, ground_from_collars, levels_from_table
from geomap.tables.findings import Check, together

Floats = NDArray[np.float64]

UNKNOWN_BASIS = "ground not known: levels count from the ground, which is drawn at 0"
NEEDS_GROUND = Check(
    "formation without ground levels",
    "query",
    "a ground table, or ground levels of borings",
    "cut and fill cannot be told and subgrade is not assessed; give ground levels",
)
FAR_M = 30.0  # deeper cuts and higher fills are rare; common practice, no source
FAR_APART = Check(
    "formation far from the ground",
    "query",
    f"formation within {FAR_M:g} m of the ground",
    "used as it is; check the vertical datum, the unit and the reference of both tables",
)
SHORT_TABLE = Check(
    "levels do not cover the line",
    "query",
    "levels from the start of the line to its end",
    "give levels for the rest of the line",
)


@dataclass(frozen=True)
class Drawing:
    """How the drawings state the design levels: the section ``[formation]`` of a corridor file."""

    reference: str
    thickness_m: float = 0.0
    pipe_diameter_m: float | None = None


@dataclass(frozen=True)
class Along:
    """Levels and width at places along the line.

    Attributes
    ----------
    ground, formation, width
        [m], shape (places,). Formation is missing where it is not given. Ground is 0 throughout where nobody
        gave a level.
    ground_basis
        Where the ground levels come from, in words.
    ground_is_known
        Whether any level of the ground is known.
    findings
        What is odd about the tables.
    """

    ground: Floats
    formation: Floats
    width: Floats
    ground_basis: str
    ground_is_known: bool
    findings: pd.DataFrame


def levels_along(
    distance_m: Floats,
    tables: Mapping[str, tuple[str, pd.DataFrame]],
    collars: pd.DataFrame,
    chainage: Chainage,
    drawing: Drawing | None,
    width_m: float,
) -> Along:
    """Return ground, formation and width at distances along the line.

    Parameters
    ----------
    distance_m
        Where, ascending [m].
    tables
        File names and typed rows of the layout ``levels`` under ``ground`` and ``formation``, as far as the corridor
        has them.
    collars
        ``distance_m`` and ``ground_level_m`` of the borings that are used: they serve where no table reaches.
    chainage
        Of the line.
    drawing
        What the levels of the formation table are; None where there is no such table.
    width_m
        Width of the formation where no table gives one [m].
    """
    parts = []
    from_collars = ground_from_collars(collars["distance_m"], collars["ground_level_m"])
    table: LevelTable | None = None
    if "ground" in tables:
        table, found = levels_from_table(tables["ground"][1], chainage, "ground")
        parts.append(found.fillna({"file": tables["ground"][0]}))
    ground = from_collars.level_at(distance_m) if table is None else table.level_at(distance_m)
    basis = from_collars.basis if table is None else table.basis
    bare = np.isnan(ground)
    if table is not None and bare.any():
        beyond = (
            replace(table, holds_beyond=True) if np.isnan(from_collars.level_at(distance_m)).any() else from_collars
        )
        ground = np.where(bare, beyond.level_at(distance_m), ground)
        basis += "; beyond it " + ("constant" if beyond.basis == table.basis else "from collar levels of borings")
        parts.append(_short(tables["ground"][0], bare))
    is_known = bool(np.isfinite(ground).any())
    if not is_known:
        ground, basis = np.zeros(len(distance_m)), UNKNOWN_BASIS
    formation, width = np.full(len(distance_m), np.nan), np.full(len(distance_m), width_m)
    if drawing is not None:
        file, rows = tables["formation"]
        design, found = levels_from_table(rows, chainage, "formation")
        given, width = design.level_at(distance_m), design.width_at(distance_m, width_m)
        formation = formation_level(given, drawing.reference, drawing.thickness_m, drawing.pipe_diameter_m, ground)
        parts += [found.fillna({"file": file}), _short(file, np.isnan(formation))]
        if is_known:
            parts.append(_far(file, ground - formation))
        else:
            parts.append(NEEDS_GROUND.row("level_m", "no ground level", file=file))
            formation = np.full(len(distance_m), np.nan)
    return Along(ground, formation, width, basis, is_known, together(parts))


def _far(file: str, depth: Floats) -> pd.DataFrame:
    worst = float(np.nanmax(np.abs(depth), initial=0.0))
    return FAR_APART.row("level_m", f"up to {worst:.1f} m apart", file=file) if worst > FAR_M else pd.DataFrame()


def _short(file: str, bare: NDArray[np.bool_]) -> pd.DataFrame:
    if not bare.any():
        return pd.DataFrame()
    return SHORT_TABLE.row("level_m", f"none for {bare.mean():.0%} of the line", file=file)
