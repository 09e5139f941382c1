"""Coordinate systems: which are refused, their units, and transformation of tables."""

from __future__ import annotations

import warnings

import numpy as np
import pytest
from pyproj import CRS, Geod

from geomap.alignment import crs
from geomap.alignment.line import line_from_vertices
from geomap.errors import UsageError
from geomap.units import US_SURVEY_FOOT_M

UTM30 = CRS("EPSG:32630")
DEGREES = CRS("EPSG:4326")


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("EPSG:99999", "an authority code such as EPSG:32630"),
        ("", "an authority code such as EPSG:32630"),
        ("EPSG:4326", "a projected system"),
        ("EPSG:4978", "a projected system"),
        ("EPSG:3857", "web maps stretch them"),
        ("EPSG:5513", "with easting and northing"),  # southing, westing: mirrors the ground
    ],
)
def test_systems_in_which_lengths_cannot_be_measured_are_refused_with_a_remedy(text: str, words: str) -> None:
    with pytest.raises(UsageError, match=r"corridor\.toml:4: crs") as error:
        crs.projected_crs(text, "corridor.toml:4: crs")
    assert words in str(error.value)


@pytest.mark.parametrize(
    ("text", "meters"),
    [
        ("EPSG:32630", 1.0),
        ("EPSG:2263", US_SURVEY_FOOT_M),
        ("EPSG:2222", 0.3048),
        ("EPSG:7405", 1.0),
        ("EPSG:31467", 1.0),
    ],
)
def test_the_unit_is_that_of_the_axes(text: str, meters: float) -> None:
    assert crs.unit_m(crs.projected_crs(text, "crs")) == pytest.approx(meters, rel=1e-12)


def test_a_line_in_us_survey_feet_is_measured_in_meters() -> None:
    system = crs.projected_crs("EPSG:2263", "crs")
    line = line_from_vertices([(1_000_000, 200_000), (1_003_937, 200_000)], unit_m=crs.unit_m(system))
    assert line.length_m == pytest.approx(1200.0, abs=1e-9)  # 3937 US survey feet are 1200 m by definition
    there = line.points(600.0, 12.0)
    assert float(there.x) == pytest.approx(1_000_000 + 3937 / 2)
    assert float(there.y) == pytest.approx(200_000 - 39.37)


def test_transformation_there_and_back_is_the_identity() -> None:
    x, y = np.array([-1.5, -2.0, 0.3]), np.array([52.0, 51.2, 53.9])
    there = crs.to_crs(x, y, DEGREES, UTM30)
    back = crs.to_crs(there.x, there.y, UTM30, DEGREES)
    np.testing.assert_allclose(back.x, x, atol=1e-9)
    np.testing.assert_allclose(back.y, y, atol=1e-9)
    assert there.note == back.note == ""


def test_lengths_after_transformation_agree_with_the_ellipsoid() -> None:
    longitude, latitude = np.array([-3.0, -3.0]), np.array([52.0, 52.01])
    there = crs.to_crs(longitude, latitude, DEGREES, UTM30)
    on_ellipsoid = Geod(ellps="WGS84").inv(longitude[0], latitude[0], longitude[1], latitude[1])[2]
    # Scale on the central meridian of UTM is 0.9996 by definition.
    assert np.hypot(*np.diff([there.x, there.y], axis=1)) == pytest.approx(0.9996 * on_ellipsoid, rel=1e-6)


def test_missing_coordinates_stay_missing_and_the_others_are_not_disturbed() -> None:
    there = crs.to_crs([-3.0, np.nan, -3.0], [0.0, 52.0, np.nan], DEGREES, UTM30)
    np.testing.assert_allclose(there.x, [500000.0, np.nan, np.nan])
    np.testing.assert_allclose(there.y, [0.0, np.nan, np.nan], atol=1e-6)
    assert there.note == ""


def test_places_outside_the_target_are_missing_and_counted() -> None:
    there = crs.to_crs([-3.0, 400.0, 20.0], [52.0, 95.0, 1e6], DEGREES, UTM30)
    assert np.isfinite(there.x).tolist() == [True, False, False]
    assert "2 places have no position" in there.note


def test_the_same_system_leaves_coordinates_as_they_are() -> None:
    there = crs.to_crs([1.0, np.nan], [2.0, 3.0], UTM30, CRS("EPSG:32630"))
    np.testing.assert_array_equal(there.x, [1.0, np.nan])
    np.testing.assert_array_equal(there.y, [2.0, np.nan])


def test_a_missing_grid_file_is_said_in_a_note_and_not_as_a_warning() -> None:
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        there = crs.to_crs([400000.0], [300000.0], CRS("EPSG:27700"), DEGREES)
    # With the national grid file installed (some systems have it) there is nothing to say.
    assert np.isfinite(there.x).all()
    assert ("needs a grid file" in there.note) == (there.accuracy_m > 1.5)


def test_the_order_in_which_an_authority_lists_axes_does_not_matter() -> None:
    there = crs.to_crs([9.0], [50.0], CRS("EPSG:4314"), CRS("EPSG:31467"))  # northing listed first
    # Gauss-Kruger zone 3: false easting 3,500,000 m on the meridian 9 east, scale 1 there; Bessel ellipsoid.
    assert float(there.x[0]) == pytest.approx(3_500_000, abs=1e-3)
    assert float(there.y[0]) == pytest.approx(Geod(ellps="bessel").inv(9, 0, 9, 50)[2], abs=1e-2)


def test_a_wrong_zone_is_noticed_by_its_scale_and_the_right_one_is_not() -> None:
    longitude, latitude = [-2.9, -2.8], [52.0, 52.0]
    right = crs.to_crs(longitude, latitude, DEGREES, UTM30)
    wrong = crs.to_crs(longitude, latitude, DEGREES, CRS("EPSG:32631"))
    assert crs.scale_note(right.x, right.y, UTM30) == ""
    assert "parts per million" in crs.scale_note(wrong.x, wrong.y, CRS("EPSG:32631"))
    assert "check the zone" in crs.scale_note(right.x, right.y, UTM30, grid_to_ground=1.01)
