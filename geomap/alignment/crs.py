"""Coordinate reference systems: the unit of the corridor's, and coordinates of tables brought into it.

Coordinates are always (easting, northing) or (longitude, latitude), whatever order an authority lists the axes in.
"""

from __future__ import annotations

import warnings
from typing import NamedTuple

import numpy as np
from numpy.typing import ArrayLike, NDArray
from pyproj import CRS, Proj, Transformer
from pyproj.exceptions import CRSError
from pyproj.transformer import AreaOfInterest, TransformerGroup

from geomap.errors import UsageError, problem

Floats = NDArray[np.float64]

PSEUDO_MERCATOR = "Popular Visualisation Pseudo Mercator"  # method name, EPSG dataset, method 1024
AREA_MARGIN_DEG = 1.0  # beyond the area of use that a line may reach; common practice, no source
LENGTH_ERROR_PPM = 1000.0  # 1 m in 1 km; common practice, no source
AREA_MARGIN_DEG = 0.01  # an area without width is none to some releases of PROJ
_RIGHT_HANDED = {("east", "north"), ("north", "east"), ("west", "south")}  # the second is read as the first


class Transformed(NamedTuple):
    """Coordinates in another system, missing where they have no place there, and what to know about them.

    Attributes
    ----------
    x, y
        Shape of the input.
    accuracy_m
        Stated accuracy of the transformation between the datums [m]; NaN where none is stated.
    note
        Blank, or a sentence for the findings: a better transformation needs a grid that is not installed, or
        places were lost.
    """

    x: Floats
    y: Floats
    accuracy_m: float
    note: str


def any_crs(text: str, place: str) -> CRS:
    """Return the coordinate reference system named by an authority code or WKT.

    Raises
    ------
    UsageError
        It is not known.
    """
    try:
        return CRS.from_user_input(text)
    except CRSError:
        remedy = "look the code up on the drawing or with the survey"
        raise UsageError(
            problem(place, text, "an authority code such as EPSG:32630, or WKT of a coordinate system", remedy)
        ) from None


def projected_crs(text: str, place: str) -> CRS:
    """Return a system in which lengths along a line can be measured.

    Parameters
    ----------
    text
        Authority code or WKT.
    place
        Where it was written, for the message.

    Raises
    ------
    UsageError
        It is unknown, not projected (degrees), the one of web maps (its lengths are stretched, by 1.62 at 52
        degrees north), or its axes mirror the ground.

    Examples
    --------
    >>> unit_m(projected_crs("EPSG:2263", "corridor.toml:4: crs"))  # New York Long Island, US survey feet
    0.30480060960121924
    >>> projected_crs("EPSG:4326", "corridor.toml:4: crs")
    Traceback (most recent call last):
    ...
    geomap.errors.UsageError: corridor.toml:4: crs: found 'EPSG:4326'; allowed: a projected system, in meters or
    feet; name the national grid or UTM zone that the drawings use, such as EPSG:32630
    """
    crs = any_crs(text, place)
    allowed = "a projected system, in meters or feet"
    remedy = "name the national grid or UTM zone that the drawings use, such as EPSG:32630"
    if not crs.is_projected or len(crs.axis_info) < 2:
        raise UsageError(problem(place, text, allowed, remedy))
    operation = crs.coordinate_operation
    if operation is not None and operation.method_name == PSEUDO_MERCATOR:
        raise UsageError(problem(place, text, f"{allowed}, that keeps lengths; web maps stretch them", remedy))
    if tuple(axis.direction for axis in crs.axis_info[:2]) not in _RIGHT_HANDED:
        raise UsageError(problem(place, text, f"{allowed}, with easting and northing", remedy))
    return crs


def unit_m(crs: CRS) -> float:
    """Return meters in one unit of the coordinates of a projected system."""
    return float(crs.axis_info[0].unit_conversion_factor)


def to_crs(x: ArrayLike, y: ArrayLike, from_crs: CRS, to: CRS) -> Transformed:
    """Return coordinates in another system.

    The transformation between datums is the most accurate one that is installed for the area of the points.

    Parameters
    ----------
    x, y
        Easting and northing, or longitude and latitude [degrees], one shape; missing in, missing out.
    from_crs, to
        Of the input and of the result.

    Examples
    --------
    >>> moved = to_crs([-3.0], [0.0], CRS("EPSG:4326"), CRS("EPSG:32630"))  # the origin of UTM zone 30 north
    >>> moved.x.round(3).tolist(), (moved.y.round(3) + 0.0).tolist(), moved.note
    ([500000.0], [0.0], '')
    """
    east, north = (np.asarray(values, dtype=float) for values in np.broadcast_arrays(x, y))
    known = np.isfinite(east) & np.isfinite(north)
    if from_crs == to or not known.any():
        return Transformed(np.where(known, east, np.nan), np.where(known, north, np.nan), 0.0, "")
    group = _transformations(east[known], north[known], from_crs, to)
    if not group.transformers:
        return Transformed(
            np.full(east.shape, np.nan), np.full(east.shape, np.nan), np.nan,
            f"no transformation is known from {from_crs.name} to {to.name}",
        )  # fmt: skip
    best = group.transformers[0]
    new_x, new_y = _moved(best, np.where(known, east, np.nan), np.where(known, north, np.nan))
    found = np.isfinite(new_x) & np.isfinite(new_y)
    notes = []
    accuracy = float(best.accuracy) if best.accuracy >= 0 else np.nan
    if not group.best_available:
        within = "unknown" if np.isnan(accuracy) else f"{accuracy:g} m"
        notes.append(
            f"the best transformation from {from_crs.name} to {to.name} needs a grid file that is not installed; "
            f"accuracy of the one used: {within}"
        )
    if (known & ~found).any():
        notes.append(f"{int((known & ~found).sum())} places have no position in {to.name}: check their crs")
    return Transformed(np.where(found, new_x, np.nan), np.where(found, new_y, np.nan), accuracy, "; ".join(notes))


def scale_note(x: ArrayLike, y: ArrayLike, crs: CRS, grid_to_ground: float = 1.0) -> str:
    """Return a sentence where lengths measured in `crs` are off by more than 1 m in 1 km, else a blank text.

    That far off, the zone is wrong or a factor of grid to ground is missing. Height above the ellipsoid (about 16 ppm
    for each 100 m) is not counted.

    Parameters
    ----------
    x, y
        Vertices of the alignment.
    crs
        Projected system of x and y.
    grid_to_ground
        Ground distance over grid distance that the corridor states.
    """
    geographic = Transformer.from_crs(crs, crs.geodetic_crs, always_xy=True)
    longitude, latitude = _moved(geographic, np.asarray(x, dtype=float), np.asarray(y, dtype=float))
    scale = np.asarray(Proj(crs).get_factors(longitude, latitude).meridional_scale) * grid_to_ground
    error = (scale - 1.0) * 1e6
    worst = float(error[np.argmax(np.abs(error))])
    if np.isfinite(worst) and abs(worst) <= LENGTH_ERROR_PPM:
        return ""
    return (
        f"lengths in {crs.name} are off by {worst:+.0f} parts per million here: check the zone, or state grid_to_ground"
    )


def _transformations(x: Floats, y: Floats, from_crs: CRS, to: CRS) -> TransformerGroup:
    """Return the transformations for the area of the points, the best first."""
    longitude, latitude = x, y
    if not from_crs.is_geographic and from_crs.geodetic_crs is not None:
        longitude, latitude = _moved(Transformer.from_crs(from_crs, from_crs.geodetic_crs, always_xy=True), x, y)
    inside = np.isfinite(longitude) & np.isfinite(latitude) & (np.abs(longitude) <= 180) & (np.abs(latitude) <= 90)
    area = None
    if inside.any():
        area = AreaOfInterest(
            max(-180.0, float(longitude[inside].min()) - AREA_MARGIN_DEG),
            max(-90.0, float(latitude[inside].min()) - AREA_MARGIN_DEG),
            min(180.0, float(longitude[inside].max()) + AREA_MARGIN_DEG),
            min(90.0, float(latitude[inside].max()) + AREA_MARGIN_DEG),
        )
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")  # a missing grid is said in the note
        return TransformerGroup(from_crs, to, always_xy=True, area_of_interest=area)


def _moved(transformer: Transformer, x: Floats, y: Floats) -> tuple[Floats, Floats]:
    """Return transformed arrays of the same shape."""
    # Never one point alone: pyproj before 3.7 takes an array of one for a scalar.
    new_x, new_y = transformer.transform(np.append(x, np.nan), np.append(y, np.nan))
    return np.asarray(new_x)[:-1].reshape(x.shape), np.asarray(new_y)[:-1].reshape(x.shape)


def area_note(x: ArrayLike, y: ArrayLike, crs: CRS) -> str:
    """Return a sentence where the line lies outside the area that its system is made for, else a blank text.

    Parameters
    ----------
    x, y
        Vertices of the alignment.
    crs
        Projected system of x and y.
    """
    area = crs.area_of_use
    if area is None:
        return ""
    to_degrees = Transformer.from_crs(crs, CRS("EPSG:4326"), always_xy=True)
    longitude, latitude = to_degrees.transform(np.mean(np.asarray(x, float)), np.mean(np.asarray(y, float)))
    east = (longitude - area.west + AREA_MARGIN_DEG) % 360.0 <= (area.east - area.west) % 360.0 + 2 * AREA_MARGIN_DEG
    if east and area.south - AREA_MARGIN_DEG <= latitude <= area.north + AREA_MARGIN_DEG:
        return ""
    place = f"{latitude:.2f} north, {longitude:.2f} east" if np.isfinite(latitude) else "no place on earth"
    return f"the line lies at {place}, outside the area of {crs.name} ({area.name})"
