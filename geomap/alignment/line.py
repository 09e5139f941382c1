"""The line: vertices, ground distance along them, places on and beside it, and pieces cut out of it.

Coordinates stay in the unit of their system; distances and offsets are ground meters: grid length x meters in a unit x
grid-to-ground factor. Length is that of the plan; levels do not count.

A line of chords is shorter than the arc it stands for: chords of c on radius R lose c^2 / (24 R^2) of the length and
lie up to c^2 / (8 R) inside (R = 400 m, c = 10 m: 26 mm in 1 km, 31 mm).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any, NamedTuple

import numpy as np
import shapely
from numpy.typing import ArrayLike, NDArray

from geomap.errors import InputError, UsageError, problem

Floats = NDArray[np.float64]

END_TOLERANCE_M = 0.0005  # a distance so little beyond an end is the end
LEAST_SEGMENT_M = 1e-6  # a vertex so near to the last one, or to the cut of a piece, is not kept


class Places(NamedTuple):
    """Coordinates, and the bearing of the line there [degrees clockwise from grid north]; one shape."""

    x: Floats
    y: Floats
    bearing_deg: Floats


@dataclass(frozen=True, eq=False)
class Line:
    """A line measured on the ground. Made by :func:`line_from_vertices`.

    Attributes
    ----------
    vertices
        Coordinates in the unit of their system, shape (vertices, 2).
    distance
        Ground distance of each vertex from the start [m], growing from 0.
    grid_to_ground
        Ground distance over grid distance.
    unit_m
        Meters in one unit of the coordinates.
    """

    vertices: Floats
    distance: Floats
    grid_to_ground: float = 1.0
    unit_m: float = 1.0

    @property
    def length_m(self) -> float:
        """Ground length [m]."""
        return float(self.distance[-1])

    @property
    def scale(self) -> float:
        """Ground meters in one unit of the coordinates."""
        return self.unit_m * self.grid_to_ground

    @cached_property
    def direction(self) -> Floats:
        """Unit vector of each segment, shape (vertices - 1, 2)."""
        step = np.diff(self.vertices, axis=0)
        unit: Floats = step / np.hypot(step[:, 0], step[:, 1])[:, None]
        return unit

    @cached_property
    def geometry(self) -> Any:
        """The whole line as a shapely LineString."""
        return shapely.linestrings(self.vertices)

    def points(self, distance: ArrayLike, offset: ArrayLike = 0.0) -> Places:
        """Return places at a distance along the line and an offset square to it.

        At a vertex the segment that follows gives the direction. Beyond an end there is no line: missing.

        Parameters
        ----------
        distance
            [m], any shape.
        offset
            [m], right positive, of a shape that fits.

        Examples
        --------
        >>> line = line_from_vertices([(0, 0), (0, 100), (100, 100)])
        >>> line.points([50.0, 150.0], 10.0)
        Places(x=array([10., 50.]), y=array([50., 90.]), bearing_deg=array([ 0., 90.]))
        """
        at, aside = (np.asarray(a, dtype=float) for a in np.broadcast_arrays(distance, offset))
        on_line = (at >= -END_TOLERANCE_M) & (at <= self.length_m + END_TOLERANCE_M)
        at = np.where(on_line, np.clip(at, 0.0, self.length_m), np.nan)
        segment = np.clip(np.searchsorted(self.distance, at, side="right") - 1, 0, len(self.direction) - 1)
        along = self.direction[segment]
        x = np.interp(at, self.distance, self.vertices[:, 0]) + along[..., 1] * aside / self.scale
        y = np.interp(at, self.distance, self.vertices[:, 1]) - along[..., 0] * aside / self.scale
        bearing = np.degrees(np.arctan2(along[..., 0], along[..., 1])) % 360.0
        return Places(x, y, np.where(on_line, bearing, np.nan))

    def piece(self, start: float, end: float) -> Floats:
        """Return coordinates of the line from `start` to `end` [m], shape (vertices, 2): ends and vertices between.

        Raises
        ------
        InputError
            The piece has no length, or reaches beyond an end.

        Examples
        --------
        >>> line_from_vertices([(0, 0), (0, 100), (100, 100)]).piece(90.0, 120.0).tolist()
        [[0.0, 90.0], [0.0, 100.0], [20.0, 100.0]]
        """
        return self._cut(np.array([start, end]))[0]

    def pieces(self, edges: ArrayLike) -> NDArray[np.object_]:
        """Return the pieces of the line between neighboring edges, as shapely LineStrings without gap or overlap.

        Parameters
        ----------
        edges
            Distances [m], growing, shape (pieces + 1,).

        Raises
        ------
        InputError
            The edges do not grow, or reach beyond an end.
        """
        coordinates, owner = self._cut(np.asarray(edges, dtype=float))
        result: NDArray[np.object_] = np.asarray(shapely.linestrings(coordinates, indices=owner), dtype=object)
        return result

    def _cut(self, edges: Floats) -> tuple[Floats, NDArray[np.intp]]:
        """Return coordinates of all pieces, one after the other, and the number of the piece of each."""
        inside = (edges >= -END_TOLERANCE_M) & (edges <= self.length_m + END_TOLERANCE_M)
        if len(edges) < 2 or not inside.all() or not (np.diff(edges) > LEAST_SEGMENT_M).all():
            allowed = f"growing distances from 0 to {self.length_m:.3f}"
            raise InputError(problem("pieces of the alignment", edges.tolist(), allowed, "correct the distances"))
        ends = self.points(edges)
        at_ends = np.column_stack([ends.x, ends.y])
        first = np.searchsorted(self.distance, edges[:-1] + LEAST_SEGMENT_M, side="right")
        last = np.searchsorted(self.distance, edges[1:] - LEAST_SEGMENT_M, side="left")
        count = np.maximum(last - first, 0) + 2
        stop = np.cumsum(count)
        owner = np.repeat(np.arange(len(count)), count)
        place = np.arange(stop[-1]) - np.repeat(stop - count, count)  # number of the vertex in its piece
        coordinates = self.vertices[np.clip(first[owner] + place - 1, 0, len(self.vertices) - 1)]
        coordinates[stop - count] = at_ends[:-1]
        coordinates[stop - 1] = at_ends[1:]
        return coordinates, owner


def line_from_vertices(
    vertices: ArrayLike, grid_to_ground: float = 1.0, unit_m: float = 1.0, place: str = "alignment"
) -> Line:
    """Return the line through vertices.

    Parameters
    ----------
    vertices
        Shape (vertices, 2 or more), in order; further coordinates are not looked at. A vertex that repeats the one
        before it is left out.
    grid_to_ground
        Ground distance over grid distance.
    unit_m
        Meters in one unit of the coordinates: `geomap.alignment.crs.unit_m`.
    place
        File, for the message.

    Raises
    ------
    InputError
        Fewer than two different vertices, or one without coordinates.
    UsageError
        A factor is not a positive number.

    Examples
    --------
    >>> line_from_vertices([(0, 0), (300, 400)], grid_to_ground=1.0001).length_m
    500.05
    """
    for name, factor in (("grid_to_ground", grid_to_ground), ("unit of the crs", unit_m)):
        if not (np.isfinite(factor) and factor > 0):
            raise UsageError(problem(f"{place}, {name}", factor, "a positive number", "correct it"))
    array = np.asarray(vertices, dtype=float)
    if array.ndim != 2 or array.shape[1] < 2:
        raise InputError(problem(place, f"shape {array.shape}", "rows of x and y", "give one row for each vertex"))
    array = array[:, :2].copy()
    missing = ~np.isfinite(array).all(axis=1)
    if missing.any():
        found = f"no coordinates in vertex {int(np.argmax(missing)) + 1}"
        raise InputError(problem(place, found, "x and y for every vertex", "fill them in or remove the row"))
    step = np.hypot(*np.diff(array, axis=0).T) if len(array) > 1 else np.zeros(0)
    array = array[np.concatenate([[True], step * unit_m > LEAST_SEGMENT_M])[: len(array)]]
    if len(array) < 2:
        found = f"{len(array)} different vertices"
        raise InputError(problem(place, found, "two or more", "check that the file holds the alignment"))
    length = np.hypot(*np.diff(array, axis=0).T) * unit_m * grid_to_ground
    return Line(array, np.concatenate([[0.0], np.cumsum(length)]), grid_to_ground, unit_m)
