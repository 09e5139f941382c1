"""The line: measuring, places beside it, pieces. Lines are constructed."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
import shapely

from geomap.alignment.line import line_from_vertices
from geomap.errors import InputError, UsageError

CORNER = line_from_vertices([(0, 0), (0, 100), (100, 100)])


def arc(radius: float, chord: float) -> np.ndarray:
    """Return vertices on a quarter circle, spaced by a chord."""
    angle = np.arange(0, np.pi / 2, 2 * np.arcsin(chord / 2 / radius))
    return radius * np.column_stack([np.cos(angle), np.sin(angle)])


def test_distances_are_ground_meters() -> None:
    line = line_from_vertices([(0, 0), (300, 400), (300, 500)], grid_to_ground=1.0002, unit_m=0.3048)
    np.testing.assert_allclose(line.distance, np.array([0, 500, 600]) * 0.3048 * 1.0002)
    assert line.length_m == pytest.approx(600 * 0.3048 * 1.0002)


def test_offsets_are_ground_meters_too() -> None:
    line = line_from_vertices([(0, 0), (0, 1000)], grid_to_ground=1.0002, unit_m=0.3048)
    beside = line.points(0.0, 30.48)
    assert float(beside.x) == pytest.approx(100 / 1.0002)


def test_repeated_vertices_and_levels_do_not_count() -> None:
    line = line_from_vertices([(0, 0, 5), (0, 0, 9), (3, 4, 50), (3, 4, 50)])
    assert line.vertices.shape == (2, 2)
    assert line.length_m == 5.0


def test_right_is_positive_and_bearings_go_clockwise_from_north() -> None:
    places = CORNER.points([50.0, 50.0, 150.0, 150.0], [10.0, -10.0, 10.0, -10.0])
    np.testing.assert_allclose(places.x, [10, -10, 50, 50])
    np.testing.assert_allclose(places.y, [50, 50, 90, 110])
    np.testing.assert_allclose(places.bearing_deg, [0, 0, 90, 90])
    south_west = line_from_vertices([(0, 0), (-1, -1)]).points(0.5)
    assert float(south_west.bearing_deg) == pytest.approx(225.0)


def test_vertices_and_ends_are_met_exactly() -> None:
    rng = np.random.default_rng(2)
    line = line_from_vertices(np.cumsum(rng.uniform(1, 50, (40, 2)), axis=0) + 5_300_000.456, 1.00012)
    places = line.points(line.distance)
    np.testing.assert_array_equal(np.column_stack([places.x, places.y]), line.vertices)


def test_beyond_the_ends_there_is_no_place() -> None:
    places = CORNER.points([-1.0, -0.0004, 200.0004, 201.0, np.nan])
    assert np.isfinite(places.x).tolist() == [False, True, True, False, False]
    assert np.isfinite(places.bearing_deg).tolist() == [False, True, True, False, False]
    np.testing.assert_array_equal([places.x[1], places.y[1], places.x[2], places.y[2]], [0, 0, 100, 100])


def test_a_piece_has_its_ends_and_the_vertices_between() -> None:
    np.testing.assert_allclose(CORNER.piece(90, 120), [[0, 90], [0, 100], [20, 100]])
    np.testing.assert_allclose(CORNER.piece(100, 120), [[0, 100], [20, 100]])
    np.testing.assert_allclose(CORNER.piece(20, 100), [[0, 20], [0, 100]])
    np.testing.assert_allclose(CORNER.piece(0, 200), CORNER.vertices)


def test_pieces_tile_the_line_without_gap_or_overlap() -> None:
    rng = np.random.default_rng(3)
    line = line_from_vertices(np.cumsum(rng.uniform(-20, 50, (500, 2)), axis=0), unit_m=0.3048)
    edges = np.append(np.arange(0, line.length_m, 1.0), line.length_m)
    pieces = line.pieces(edges)
    assert len(pieces) == len(edges) - 1
    np.testing.assert_allclose(shapely.length(pieces) * line.scale, np.diff(edges), atol=1e-6)
    assert all(shapely.get_point(a, -1) == shapely.get_point(b, 0) for a, b in itertools.pairwise(pieces))
    merged = np.vstack([shapely.get_coordinates(piece)[:-1] for piece in pieces] + [line.vertices[-1:]])
    kept = [tuple(vertex) for vertex in merged]
    assert set(map(tuple, line.vertices)) <= set(kept)


def test_a_piece_is_the_same_alone_and_among_others() -> None:
    line = line_from_vertices(arc(400, 10))
    pieces = line.pieces([0, 33.3, 70, line.length_m])
    np.testing.assert_array_equal(shapely.get_coordinates(pieces[1]), line.piece(33.3, 70))


@pytest.mark.parametrize("edges", [[0, 250], [-5, 10], [10, 10], [10, 5], [0, np.nan], [0]])
def test_edges_that_do_not_grow_or_leave_the_line_are_refused(edges: list[float]) -> None:
    with pytest.raises(InputError, match="growing distances from 0 to 200"):
        CORNER.pieces(edges)


def test_chords_of_an_arc_lose_what_the_docstring_says() -> None:
    # R = 400 m, chords of 10 m: 31 mm of sagitta, and 26 mm of length in 1 km.
    vertices = arc(400, 10)
    line = line_from_vertices(vertices)
    true = 400 * 2 * np.arcsin(10 / 2 / 400) * (len(vertices) - 1)
    assert (true - line.length_m) / true * 1e6 == pytest.approx(10**2 / (24 * 400**2) * 1e6, rel=1e-3)
    assert (true - line.length_m) / true * 1e6 == pytest.approx(26, abs=0.5)
    middle = line.points(5.0)
    assert (400 - np.hypot(middle.x, middle.y)) * 1000 == pytest.approx(31, abs=0.5)


@pytest.mark.parametrize(
    ("vertices", "words"),
    [
        ([(0, 0)], "two or more"),
        ([(1, 1), (1, 1)], "two or more"),
        (np.empty((0, 2)), "two or more"),
        ([(0, 0), (np.nan, 1)], "vertex 2"),
        ([0, 1], "rows of x and y"),
    ],
)
def test_what_is_no_line_is_refused(vertices, words: str) -> None:
    with pytest.raises(InputError, match=words):
        line_from_vertices(vertices, place="road.csv")


@pytest.mark.parametrize("factor", [0.0, -1.0, np.nan])
def test_a_factor_that_is_no_positive_number_is_wrong_usage(factor: float) -> None:
    with pytest.raises(UsageError, match="grid_to_ground"):
        line_from_vertices([(0, 0), (1, 1)], grid_to_ground=factor)


def test_the_vertices_given_are_left_as_they_were() -> None:
    given = np.array([[0.0, 0.0], [0.0, 0.0], [1.0, 1.0]])
    line = line_from_vertices(given)
    line.points([0.5], [3.0])
    np.testing.assert_array_equal(given, [[0, 0], [0, 0], [1, 1]])
