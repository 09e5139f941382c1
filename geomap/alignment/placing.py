"""Borings of any coordinate system placed on the line."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
from numpy.typing import ArrayLike, NDArray
from pyproj import CRS

from geomap.alignment.crs import any_crs, to_crs
from geomap.alignment.line import Line
from geomap.alignment.locate import locate
from geomap.tables.findings import Check, together

Floats = NDArray[np.float64]

LESS_ACCURATE = Check(
    "coordinates transformed", "convert", "a transformation between datums", "check that it is enough"
)


def vertices_in(vertices: ArrayLike, from_crs: CRS, to: CRS) -> Floats:
    """Return the vertices of a line in another system, shape (vertices, 2)."""
    array = np.asarray(vertices, dtype=float)
    moved = to_crs(array[:, 0], array[:, 1], from_crs, to)
    return np.column_stack([moved.x, moved.y])


def place_borings(
    line: Line, crs: CRS, borings: pd.DataFrame, file_crs: Mapping[str, str], half_width_m: float
) -> tuple[pd.DataFrame, pd.DataFrame]:
    """Place borings on the line.

    Parameters
    ----------
    line, crs
        The alignment and the system of its vertices.
    borings
        ``x``, ``y``, ``crs`` (blank where the file or the corridor says it) and ``file``.
    file_crs
        System of the rows of each file that do not name their own; a file that is not here is in `crs`.
    half_width_m
        Half the width of the corridor [m].

    Returns
    -------
    DataFrame
        Same index: ``x`` and ``y`` in `crs`; the columns of `locate`; ``geographic``, whether the row is in
        degrees; ``swapped_away_m``, how far from the line it would be with x and y changed round.
    DataFrame
        Findings where a transformation is less accurate than it could be.

    Raises
    ------
    UsageError
        A system is not known.
    """
    by_file = [file_crs.get(file, "") for file in borings["file"]]
    named = borings["crs"].astype(object).where(borings["crs"].notna(), by_file)
    x, y, other_x, other_y = (np.full(len(borings), np.nan) for _ in range(4))
    geographic = np.zeros(len(borings), dtype=bool)
    notes = []
    given_x, given_y = borings["x"].to_numpy(float), borings["y"].to_numpy(float)
    for name in dict.fromkeys(named):
        rows = (named == name).to_numpy()
        own = any_crs(name, f"{borings['file'][rows].iloc[0]}, crs") if name else crs
        geographic[rows] = own.is_geographic
        moved = to_crs(given_x[rows], given_y[rows], own, crs)
        swapped = to_crs(given_y[rows], given_x[rows], own, crs)
        x[rows], y[rows], other_x[rows], other_y[rows] = moved.x, moved.y, swapped.x, swapped.y
        if moved.note:
            notes.append(LESS_ACCURATE.row("x, y", moved.note, file=borings["file"][rows].iloc[0]))
    placed = locate(line, pd.Series(x, borings.index), pd.Series(y, borings.index), half_width_m)
    swapped_away = locate(line, other_x, other_y, half_width_m)["away_m"].to_numpy()
    return placed.assign(x=x, y=y, geographic=geographic, swapped_away_m=swapped_away), together(notes)
