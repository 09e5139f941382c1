"""Where places lie along and beside the line: distance, offset, side, and whether that is sure."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import shapely
from numpy.typing import ArrayLike, NDArray

from geomap.alignment.line import Line

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

ON_LINE_M = 0.005  # offsets that round to 0.00
PAST_END_M = 5.0  # a hole this little beyond an end still observes the end: the reach of an observation along the line
# A second place on the line makes the first doubtful where it is hardly farther away and well apart along the line, as
# between the legs of a hairpin. Common practice, no source.
SECOND_FACTOR = 1.5
SECOND_EXTRA_M = 10.0
SECOND_APART_HALF_WIDTHS = 5.0
BLOCK_POINTS = 4096  # points that look for a second place together


def locate(line: Line, x: ArrayLike, y: ArrayLike, half_width_m: float) -> pd.DataFrame:
    """Return where points lie along the line.

    The distance is that of the nearest place on the line; in the outer angle of a bend this is the vertex, and the
    offset is then the distance to it. Beyond an end the distance is that of the end, and the offset is square to
    the last segment drawn out.

    Parameters
    ----------
    line
        In the system of x and y.
    x, y
        Shape (points,); series keep their index; missing in, missing out.
    half_width_m
        Half the width of the corridor [m]: only points within it look for a second place, which must be
        ``SECOND_APART_HALF_WIDTHS`` times as far away along the line.

    Returns
    -------
    DataFrame
        ``distance_m``; ``offset_m``, right positive; ``side`` (left, right, on line); ``away_m``, shortest distance to
        the line; ``beyond_m``, how far along beyond an end: negative before the start, positive past the end, else
        0; ``past_end``, whether that is more than ``PAST_END_M`` at either end; ``ambiguous``; ``second_distance_m`` of
        the second place, missing if there is none.

    Examples
    --------
    >>> from geomap.alignment.line import line_from_vertices
    >>> line = line_from_vertices([(0, 0), (0, 100), (100, 100)])
    >>> locate(line, [5, 50, -3], [50, 108, -7], half_width_m=75).iloc[:, :6]
       distance_m  offset_m   side    away_m  beyond_m  past_end
    0        50.0       5.0  right  5.000000       0.0     False
    1       150.0      -8.0   left  8.000000       0.0     False
    2         0.0      -3.0   left  7.615773      -7.0      True
    """
    index = x.index if isinstance(x, pd.Series) else pd.RangeIndex(len(np.asarray(x)))
    places = np.column_stack([np.asarray(x, dtype=float), np.asarray(y, dtype=float)])
    known = np.flatnonzero(np.isfinite(places).all(axis=1))
    found = {name: np.full(len(places), np.nan) for name in ("distance", "offset", "away", "beyond", "second")}
    if len(known):
        tree = shapely.STRtree(shapely.linestrings(np.stack([line.vertices[:-1], line.vertices[1:]], axis=1)))
        near = _nearest(line, tree, places[known])
        near["second"] = _second(line, tree, places[known], near, half_width_m)
        for name, values in near.items():
            found[name][known] = values
    offset = found["offset"]
    side = pd.Series(np.where(offset > 0, "right", "left"), index, dtype="string")
    return pd.DataFrame(
        {
            "distance_m": found["distance"],
            "offset_m": offset,
            "side": side.mask(np.abs(offset) < ON_LINE_M, "on line").mask(np.isnan(offset)),
            "away_m": found["away"],
            "beyond_m": found["beyond"],
            "past_end": np.abs(found["beyond"]) > PAST_END_M,
            "ambiguous": np.isfinite(found["second"]),
            "second_distance_m": found["second"],
        },
        index=index,
    )


def _nearest(line: Line, tree: Any, places: Floats) -> dict[str, Floats]:
    """Return distance, offset, shortest distance and length beyond an end of the nearest place on the line."""
    point, segment = tree.query_nearest(shapely.points(places), all_matches=True)
    segment = segment[np.lexsort((segment, point))][np.searchsorted(np.sort(point), np.arange(len(places)))]
    along, across = _feet(line, places, segment)
    length = line.distance[segment + 1] - line.distance[segment]
    last = len(line.direction) - 1
    foot = np.clip(along, 0.0, length)
    at_end = ((segment == 0) & (along < 0)) | ((segment == last) & (along > length))
    away = np.hypot(across, along - foot)
    # At a vertex inside the line the offset is the distance to it, on the outer side of the bend.
    vertex = np.where(along > length, segment + 1, segment)
    at_vertex = ((along < 0) | (along > length)) & (vertex > 0) & (vertex <= last)
    turn = _turn(line, np.clip(vertex, 1, max(last, 1)))
    outer = np.where(turn != 0.0, turn, across)  # a left turn has its outer side on the right: positive
    return {
        "distance": line.distance[segment] + foot,
        "offset": np.where(at_vertex, np.copysign(away, outer), across) + 0.0,
        "away": away,
        "beyond": np.where(at_end, along - foot, 0.0),
    }


def _feet(line: Line, places: Floats, segment: Ints) -> tuple[Floats, Floats]:
    """Return how far along a segment drawn out each place lies, and how far to its right [m]."""
    away = (places - line.vertices[segment]) * line.scale
    unit = line.direction[segment]
    return (away * unit).sum(axis=1), away[:, 0] * unit[:, 1] - away[:, 1] * unit[:, 0]


def _turn(line: Line, vertex: Ints) -> Floats:
    """Return the sine of the turn at vertices inside the line, left positive; 0 on a line of one segment."""
    if len(line.direction) == 1:
        return np.zeros(len(vertex))
    before, after = line.direction[vertex - 1], line.direction[vertex]
    turn: Floats = before[:, 0] * after[:, 1] - before[:, 1] * after[:, 0]
    return turn


def _second(line: Line, tree: Any, places: Floats, near: dict[str, Floats], half_width_m: float) -> Floats:
    """Return the distance of a second place hardly farther off and well apart along the line, or missing."""
    result = np.full(len(places), np.nan)
    looking = np.flatnonzero(near["away"] <= half_width_m)
    for start in range(0, len(looking), BLOCK_POINTS):
        rows = looking[start : start + BLOCK_POINTS]
        radius = np.maximum(near["away"][rows] * SECOND_FACTOR, near["away"][rows] + SECOND_EXTRA_M)
        pair, segment = tree.query(shapely.points(places[rows]), predicate="dwithin", distance=radius / line.scale)
        point = rows[pair]
        along, across = _feet(line, places[point], segment)
        length = line.distance[segment + 1] - line.distance[segment]
        foot = np.clip(along, 0.0, length)
        distance = line.distance[segment] + foot
        apart = np.abs(distance - near["distance"][point]) > SECOND_APART_HALF_WIDTHS * half_width_m
        far = np.flatnonzero(apart)  # few or none, so the rest is done for these only
        far = far[_is_least(line, places[point[far]], segment[far], along[far], length[far])]
        away = np.hypot(across[far], along[far] - foot[far])
        order = far[np.lexsort((away, point[far]))]
        chosen, first = np.unique(point[order], return_index=True)
        result[chosen] = distance[order][first]
    return result


def _is_least(line: Line, places: Floats, segment: Ints, along: Floats, length: Floats) -> NDArray[np.bool_]:
    """Return whether the foot on a segment is nearer than the line on both sides of it.

    A foot clamped to the end of a segment belongs to the segment that follows, which counts if it too is clamped there.
    """
    before = np.maximum(segment - 1, 0)
    along_before, _ = _feet(line, places, before)
    reaches_vertex = along_before > line.distance[before + 1] - line.distance[before]
    inside = (along >= 0) & (along <= length)
    at_vertex = (along < 0) & ((segment == 0) | reaches_vertex)
    at_end = (along > length) & (segment == len(line.direction) - 1)
    result: NDArray[np.bool_] = inside | at_vertex | at_end
    return result
