"""The plan of the page: the alignment, the borings and a coordinate grid in degrees, as a browser map draws them."""

from __future__ import annotations

import warnings
from collections.abc import Callable
from typing import Any

import numpy as np
import pyproj
import shapely
from numpy.typing import NDArray
from pyproj.exceptions import ProjError
from pyproj.transformer import TransformerGroup

from geomap.exports.web_columns import numbers
from geomap.results import Results

DEGREE_DIGITS = 7  # about 1 cm on the ground
GRID_LINES = 9  # about as many coarse grid lines as the wider side of the plan may carry
FINE_PER_COARSE = 5
# How far the grid reaches beyond the line, in sides of its box: east and west for a low, wide frame around a line
# that runs north, at one zoom level out.
COARSE_MARGIN = (12.0, 2.0)
FINE_MARGIN = (0.75, 0.25)
# Vertices of one grid line, north and east: a straight line of the projection is a curve in degrees, and the lines
# of equal northing are the long ones.
GRID_POINTS = (5, 13)

Floats = NDArray[np.float64]
Degrees = Callable[[Floats, Floats], tuple[Floats, Floats]]


def plan(results: Results) -> dict[str, Any]:
    """Return the line, the grid and the borings' places in degrees, with a note where they are approximate.

    ``local`` is True where the coordinate reference system has no place on the globe; coordinates are then
    meters of that system and the map is a plain plane.
    """
    to_degrees, local, note = degrees_from_projected(results.crs)
    line = results.tables["alignment"]["geometry"].iloc[0]
    at, x, y = line_points(results)
    lon, lat = to_degrees(x, y)
    places = results.tables["borings"]["geometry"].to_numpy(object)  # a boring without coordinates has no point
    boring_lon, boring_lat = to_degrees(shapely.get_x(places), shapely.get_y(places))
    digits = 2 if local else DEGREE_DIGITS
    return {
        "local": local,
        "note": note,
        "at": numbers(at, 2),
        "lat": numbers(lat, digits),
        "lon": numbers(lon, digits),
        "grid": grid(shapely.bounds(line), to_degrees, digits),
        "borings": {"lat": numbers(boring_lat, digits), "lon": numbers(boring_lon, digits)},
    }


def degrees_from_projected(crs: str) -> tuple[Degrees, bool, str]:
    """Return the function from projected x, y to longitude, latitude; whether there is none; and what to say.

    Where PROJ knows a better way than the one it can take here, for want of a grid file, the note says so.
    """
    source = pyproj.CRS.from_user_input(crs)
    try:
        with warnings.catch_warnings():  # the group warns of a missing grid; the page says it instead
            warnings.simplefilter("ignore")
            group = TransformerGroup(source, "EPSG:4326", always_xy=True)
        transformer = group.transformers[0]
    except (ProjError, IndexError):
        factor = float(source.axis_info[0].unit_conversion_factor or 1.0) if source.axis_info else 1.0
        return (
            lambda x, y: (x * factor, y * factor),
            True,
            f"The plan is in local coordinates: {source.name} has no known place on the globe.",
        )
    note = ""
    if not group.best_available:
        accuracy = transformer.accuracy
        size = f"about {accuracy:g} m" if accuracy and accuracy > 0 else "an unknown amount"
        note = (
            f"Latitude and longitude are approximate, to {size}: the datum grid for {source.name} is not "
            "installed where this page was made. Chainages, offsets and levels are not affected."
        )

    def to_degrees(x: Floats, y: Floats) -> tuple[Floats, Floats]:
        # Lists, because pyproj takes an array of one for a number and warns of it.
        lon, lat = transformer.transform(x.tolist(), y.tolist())
        return np.array(lon), np.array(lat)

    return to_degrees, False, note


def line_points(results: Results) -> tuple[Floats, Floats, Floats]:
    """Return distance, x and y of every vertex of the alignment and every step boundary, in order of distance."""
    alignment = results.tables["alignment"].iloc[0]
    line = shapely.force_2d(alignment["geometry"])
    corners = shapely.get_coordinates(line)
    sides = np.hypot(*np.diff(corners, axis=0).T)
    along = np.concatenate([[0.0], np.cumsum(sides)])
    ground_per_grid = float(alignment["length_m"]) / along[-1]  # grid_to_ground, or 1
    steps = results.tables["subgrade"]
    boundaries = np.concatenate([steps["from_distance_m"].to_numpy(float), steps["to_distance_m"].to_numpy(float)])
    at = np.unique(np.round(np.concatenate([along * ground_per_grid, boundaries]), 3))
    points = shapely.get_coordinates(shapely.line_interpolate_point(line, at / ground_per_grid))
    return at, points[:, 0], points[:, 1]


def grid(bounds: Floats, to_degrees: Degrees, digits: int) -> list[dict[str, Any]]:
    """Return lines of equal easting and northing: a coarse set far around `bounds`, a finer one near them."""
    left, bottom, right, top = (float(b) for b in bounds)
    side = max(right - left, top - bottom)
    coarse = _round_spacing(side / GRID_LINES)
    lines = []
    for spacing, (wide, high) in ((coarse, COARSE_MARGIN), (coarse / FINE_PER_COARSE, FINE_MARGIN)):
        box = [
            np.floor((left - wide * side) / coarse) * coarse,
            np.floor((bottom - high * side) / coarse) * coarse,
            np.ceil((right + wide * side) / coarse) * coarse,
            np.ceil((top + high * side) / coarse) * coarse,
        ]
        for axis in (0, 1):
            values = np.arange(box[axis], box[axis + 2] + spacing / 2, spacing)
            if spacing != coarse:
                values = values[np.abs(values / coarse - np.round(values / coarse)) > 1e-6]
            along = np.linspace(box[1 - axis], box[3 - axis], GRID_POINTS[axis])
            drawn = [_grid_line(axis, value, along, to_degrees, digits) for value in values]
            # Far from a wide corridor the projection may have no place on the globe.
            lines += [line | {"coarse": spacing == coarse} for line in drawn if None not in line["lat"] + line["lon"]]
    return lines


def _grid_line(axis: int, value: float, along: Floats, to_degrees: Degrees, digits: int) -> dict[str, Any]:
    fixed = np.full(len(along), value)
    lon, lat = to_degrees(fixed, along) if axis == 0 else to_degrees(along, fixed)
    return {
        "axis": "EN"[axis],
        "value": numbers([value], 3)[0],
        "lat": numbers(lat, digits - 1),
        "lon": numbers(lon, digits - 1),
    }


def _round_spacing(least: float) -> float:
    """Return the least of 1, 2 and 5 times a power of ten that is not below `least`."""
    power = 10.0 ** np.floor(np.log10(max(least, 1.0)))
    return float(next(k * power for k in (1, 2, 5, 10) if k * power >= least * (1 - 1e-9)))
