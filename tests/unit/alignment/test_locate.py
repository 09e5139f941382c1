"""Places beside the line: bends, ends, hairpins, missing values. Lines are constructed."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
import shapely

from geomap.alignment.line import line_from_vertices
from geomap.alignment.locate import locate

CORNER = line_from_vertices([(0, 0), (0, 100), (100, 100)])  # north, then east: a right turn
HAIRPIN = line_from_vertices([(0, 0), (0, 500), (40, 500), (40, 0)])  # two legs 40 m apart
ABSENT = np.nan


def placed(line, points: list[tuple[float, float]], half_width_m: float = 75.0) -> pd.DataFrame:
    x, y = np.array(points, dtype=float).T
    return locate(line, x, y, half_width_m)


# point, distance, offset, side
BESIDE = [
    ((5, 50), 50.0, 5.0, "right"),
    ((-5, 50), 50.0, -5.0, "left"),
    ((0, 50), 50.0, 0.0, "on line"),
    ((50, 108), 150.0, -8.0, "left"),
    ((50, 97), 150.0, 3.0, "right"),
    ((20, 90), 120.0, 10.0, "right"),  # inside the bend: square to the nearer leg
    ((10, 80), 80.0, 10.0, "right"),
    ((-3, 104), 100.0, -5.0, "left"),  # outside the bend: the vertex, and the distance to it
    ((-30, 140), 100.0, -50.0, "left"),
    ((0, 100), 100.0, 0.0, "on line"),
]


@pytest.mark.parametrize(("point", "distance", "offset", "side"), BESIDE)
def test_distance_offset_and_side_beside_a_right_angle(
    point: tuple[float, float], distance: float, offset: float, side: str
) -> None:
    row = placed(CORNER, [point]).iloc[0]
    assert row["distance_m"] == pytest.approx(distance)
    assert row["offset_m"] == pytest.approx(offset)
    assert row["side"] == side
    assert row["beyond_m"] == 0.0
    assert not row["past_end"]


def test_outside_a_left_turn_is_right_of_the_line() -> None:
    line = line_from_vertices([(0, 0), (0, 100), (-100, 100)])
    assert placed(line, [(3, 104)]).loc[0, "offset_m"] == pytest.approx(5.0)
    sharp = line_from_vertices([(0, 0), (0, 100), (-5, 0)])  # turns back by nearly 180 degrees
    assert placed(sharp, [(-2, 110), (2, 110)])["offset_m"].tolist() == pytest.approx([np.hypot(2, 10)] * 2)


def test_beyond_the_ends_the_end_is_given_and_how_far() -> None:
    rows = placed(CORNER, [(3, -40), (-3, -4), (130, 104), (100.0, 50.0)])
    np.testing.assert_allclose(rows["distance_m"], [0, 0, 200, 200])
    np.testing.assert_allclose(rows["offset_m"], [3, -3, -4, 50])
    np.testing.assert_allclose(rows["beyond_m"], [-40, -4, 30, 0])
    np.testing.assert_allclose(rows["away_m"], [np.hypot(3, 40), 5, np.hypot(30, 4), 50])
    assert rows["past_end"].tolist() == [True, False, True, False]


# point, distance, second distance
TWO_STRETCHES = [
    ((20, 250), 250.0, 790.0),  # half way between the legs: the first, and the other named
    ((18, 250), 250.0, 790.0),
    ((22, 250), 790.0, 250.0),
    ((17, 250), 250.0, 790.0),  # 17 and 23 m: within 1.5 times
    ((12, 250), 250.0, ABSENT),  # 12 and 28 m: more than 1.5 times and more than 10 m farther
    ((-10, 250), 250.0, ABSENT),
    ((20, 480), 480.0, ABSENT),  # near the turn the two places are hardly apart along the line
]


@pytest.mark.parametrize(("point", "distance", "second"), TWO_STRETCHES)
def test_between_the_legs_of_a_hairpin_the_place_is_ambiguous(
    point: tuple[float, float], distance: float, second: float
) -> None:
    row = placed(HAIRPIN, [point], half_width_m=30.0).iloc[0]
    assert row["distance_m"] == pytest.approx(distance)
    assert row["second_distance_m"] == pytest.approx(second, nan_ok=True)
    assert row["ambiguous"] == np.isfinite(second)


def test_close_to_the_line_ten_meters_count_in_place_of_the_factor() -> None:
    legs = line_from_vertices([(0, 0), (0, 500), (9, 500), (9, 0)])
    assert placed(legs, [(0.5, 250)], half_width_m=30.0).loc[0, "second_distance_m"] == pytest.approx(759.0)


def test_farther_from_the_line_the_factor_counts() -> None:
    legs = line_from_vertices([(0, 0), (0, 500), (72, 500), (72, 0)])
    rows = placed(legs, [(30, 200), (28, 200)], half_width_m=40.0)  # 30 and 42 m; 28 and 44 m
    assert rows["ambiguous"].tolist() == [True, False]


def test_a_straight_line_of_many_vertices_has_no_second_place() -> None:
    line = line_from_vertices(np.column_stack([np.zeros(2001), np.arange(2001.0)]))
    # A stretch of 10 m is within reach of these points, and 2.5 m along the line is far enough apart.
    rows = placed(line, [(0.3, 1000.3), (-0.3, 1000), (0, 5), (0.5, 1999)], half_width_m=0.5)
    assert not rows["ambiguous"].any()


def test_a_second_place_may_be_a_vertex_or_an_end() -> None:
    toe = line_from_vertices([(0, 0), (0, 400), (200, 400), (60, 200), (200, 0)])  # a vertex points at the first leg
    row = placed(toe, [(28, 200)], half_width_m=30.0).iloc[0]
    assert (row["distance_m"], row["second_distance_m"]) == pytest.approx((200.0, toe.distance[3]))
    hook = line_from_vertices([(0, 0), (0, 400), (200, 400), (200, 200), (60, 200)])  # the end points at it
    row = placed(hook, [(28, 200)], half_width_m=30.0).iloc[0]
    assert (row["distance_m"], row["second_distance_m"]) == pytest.approx((200.0, hook.length_m))


def test_far_from_the_corridor_no_second_place_is_looked_for() -> None:
    assert not placed(HAIRPIN, [(20, 5000)], half_width_m=30.0)["ambiguous"].any()


def test_missing_coordinates_have_no_place() -> None:
    rows = locate(
        CORNER, pd.Series([5.0, np.nan], index=["B1", "B2"]), pd.Series([50.0, 1.0], index=["B1", "B2"]), 75.0
    )
    assert rows.index.tolist() == ["B1", "B2"]
    assert rows.loc["B2", ["distance_m", "offset_m", "away_m", "beyond_m"]].isna().all()
    assert rows["side"].isna().tolist() == [False, True]
    assert rows[["past_end", "ambiguous"]].to_numpy().sum() == 0


def test_no_points_give_no_rows_with_the_same_columns() -> None:
    assert locate(CORNER, [], [], 75.0).columns.tolist() == placed(CORNER, [(0, 0)]).columns.tolist()
    assert len(locate(CORNER, [], [], 75.0)) == 0


def test_offsets_on_a_line_in_feet_are_meters() -> None:
    line = line_from_vertices([(0, 0), (0, 1000)], unit_m=0.3048, grid_to_ground=1.0001)
    row = placed(line, [(100, 500)]).iloc[0]
    assert row["distance_m"] == pytest.approx(500 * 0.3048 * 1.0001)
    assert row["offset_m"] == pytest.approx(30.48 * 1.0001)


def test_a_line_of_one_segment_is_enough() -> None:
    rows = placed(line_from_vertices([(0, 0), (0, 10)]), [(1, 5), (1, 20), (-1, -20)])
    np.testing.assert_allclose(rows["beyond_m"], [0, 10, -20])
    np.testing.assert_allclose(rows["offset_m"], [1, 1, -1])


def test_distances_agree_with_linear_referencing_of_geos_on_a_winding_line() -> None:
    rng = np.random.default_rng(6)
    heading = np.cumsum(rng.normal(0, 0.2, 400))
    line = line_from_vertices(np.cumsum(np.column_stack([np.cos(heading), np.sin(heading)]) * 20, axis=0))
    x, y = (
        rng.uniform(low - 50, high + 50, 3000)
        for low, high in zip(line.vertices.min(0), line.vertices.max(0), strict=True)
    )
    rows = locate(line, x, y, 75.0)
    points = shapely.points(x, y)
    np.testing.assert_allclose(rows["away_m"], shapely.distance(line.geometry, points), atol=1e-9)
    along = shapely.line_locate_point(line.geometry, points)
    differing = np.abs(along - rows["distance_m"]) > 1e-6
    assert differing.mean() < 0.001  # equally near places may be told differently
