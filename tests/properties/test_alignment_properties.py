"""Chainage to coordinates and back, on any line and with any chainage equations."""

from __future__ import annotations

import numpy as np
import shapely
from hypothesis import given, settings
from hypothesis import strategies as st

from geomap.alignment.chainage import Chainage, chainage_from_settings
from geomap.alignment.line import Line, line_from_vertices
from geomap.alignment.locate import locate
from geomap.units import INTERNATIONAL_FOOT_M, US_SURVEY_FOOT_M

MILLIMETER = 0.001


@st.composite
def lines(draw: st.DrawFn) -> Line:
    """Lines whose bearing turns by less than 15 degrees at each vertex and 80 in all, so that none nears itself."""
    turns = draw(st.lists(st.floats(-15, 15), min_size=0, max_size=12))
    bearing = np.radians(draw(st.floats(0, 360)) + np.clip(np.cumsum([0.0, *turns]), -40, 40))
    steps = np.array(draw(st.lists(st.floats(40, 400), min_size=len(bearing), max_size=len(bearing))))
    origin = np.array([draw(st.floats(1e5, 9e5)), draw(st.floats(0, 9e6))])
    moved = np.column_stack([np.sin(bearing), np.cos(bearing)]) * steps[:, None]
    vertices = origin + np.vstack([[0.0, 0.0], np.cumsum(moved, axis=0)])
    unit = draw(st.sampled_from([1.0, INTERNATIONAL_FOOT_M, US_SURVEY_FOOT_M]))
    return line_from_vertices(vertices, draw(st.floats(0.999, 1.001)), unit)


@st.composite
def chainages(draw: st.DrawFn) -> Chainage:
    """Chainages with up to three equations, gaps and overlaps."""
    start = draw(st.integers(-500, 20_000)) / 10
    reached, equations = start, []
    for length, jump in draw(st.lists(st.tuples(st.integers(1, 3000), st.integers(-2000, 2000)), max_size=3)):
        back = reached + length / 10
        reached = back + jump / 10
        equations.append((back, reached))
    form = draw(st.sampled_from(["0+000", "0+00"]))
    return chainage_from_settings(start, equations, form, draw(st.sampled_from(["m", "us-ft"])))


@settings(max_examples=150, deadline=None)
@given(line=lines(), chainage=chainages(), share=st.lists(st.floats(0, 1), min_size=1, max_size=8))
def test_chainage_to_coordinates_and_back_is_the_same_within_a_millimeter(
    line: Line, chainage: Chainage, share: list[float]
) -> None:
    on_line = [at for at, _ in chainage.breaks if at <= line.length_m]
    distance = np.array([*(np.array(share) * line.length_m), *on_line])
    label = chainage.label_from_distance(distance)
    located = chainage.distance_from_label(label)
    choices = np.column_stack([located.distance_m, located.second_distance_m])
    places = line.points(distance)
    found = locate(line, places.x, places.y, 1.0)
    np.testing.assert_allclose(found["distance_m"], distance, atol=MILLIMETER)
    # The label comes back to the place; where it occurs more than twice, further places are only told in words.
    off = np.nanmin(np.abs(choices - found["distance_m"].to_numpy()[:, None]), axis=1)
    thrice = np.array(
        [reason.startswith("this chainage occurs 3") or "occurs 4" in reason for reason in located.reason]
    )
    assert (off[~thrice] <= MILLIMETER).all()
    again = chainage.chainage_from_distance(found["distance_m"])
    same = np.abs(again - chainage.chainage_from_distance(distance)) <= MILLIMETER
    at_equation = np.abs(distance[:, None] - [at for at, _ in chainage.breaks]).min(axis=1) <= MILLIMETER
    assert (same | at_equation).all()  # at an equation both its labels name the place


@settings(max_examples=100, deadline=None)
@given(line=lines(), share=st.floats(0.001, 0.999), offset=st.floats(-10, 10))
def test_a_place_set_out_by_distance_and_offset_is_found_again(line: Line, share: float, offset: float) -> None:
    places = line.points([share * line.length_m], [offset])
    row = locate(line, places.x, places.y, 75.0).iloc[0]
    # Inside a bend a place may be nearer to the other leg: it is never farther than it was set out.
    assert row["away_m"] <= abs(offset) + MILLIMETER
    if abs(row["away_m"] - abs(offset)) <= 1e-6 and abs(row["distance_m"] - share * line.length_m) <= MILLIMETER:
        assert abs(row["offset_m"] - offset) <= MILLIMETER
    nearest_vertex = np.abs(line.distance[1:-1] - share * line.length_m).min(initial=np.inf)
    if nearest_vertex > 5.0:  # 10 m x tan(15 degrees / 2) = 1.3 m: beyond it the legs do not compete
        assert abs(row["distance_m"] - share * line.length_m) <= MILLIMETER
        assert abs(row["offset_m"] - offset) <= MILLIMETER


@settings(max_examples=60, deadline=None)
@given(line=lines(), cuts=st.lists(st.floats(0.01, 0.99), max_size=20))
def test_pieces_add_up_to_the_line(line: Line, cuts: list[float]) -> None:
    edges = np.unique(np.round([0.0, *(np.array(cuts) * line.length_m)], 2))
    edges = np.append(edges, line.length_m)
    pieces = line.pieces(edges)
    np.testing.assert_allclose(shapely.length(pieces) * line.scale, np.diff(edges), atol=1e-5)
    joined = shapely.line_merge(shapely.multilinestrings(pieces)) if len(pieces) > 1 else pieces[0]
    assert joined.geom_type == "LineString"
    assert shapely.hausdorff_distance(joined, line.geometry) < 1e-6


@settings(max_examples=60, deadline=None)
@given(line=lines(), east=st.floats(-500, 3000), north=st.floats(-500, 3000))
def test_no_place_on_the_line_is_nearer_than_the_one_found(line: Line, east: float, north: float) -> None:
    point = line.vertices[0] + [east, north]
    row = locate(line, point[:1], point[1:], 75.0).iloc[0]
    assert abs(row["away_m"] - shapely.distance(line.geometry, shapely.Point(point)) * line.scale) <= 1e-6
    assert row["away_m"] + 1e-9 >= abs(row["offset_m"])
