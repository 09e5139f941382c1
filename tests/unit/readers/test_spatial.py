"""Layers of spatial files as tables."""

from __future__ import annotations

import datetime as dt
import json
from pathlib import Path

import geopandas
import numpy as np
import pandas as pd
import pyogrio
import pytest
import shapely

from geomap.errors import InputError, UsageError
from geomap.readers.spatial import crs_text
from tests.unit.readers.reading import cells, checks, read, text_file

BORINGS = {"Boring": ["BH1", "BH2"], "Final depth (m)": [6.0, 12.5], "remarks": ["x", None]}
POINTS = [shapely.Point(500000.25, 4100000.5), shapely.Point(500100, 4100100)]


def points(**columns: object) -> geopandas.GeoDataFrame:
    """Return two borings as points, with further columns."""
    return geopandas.GeoDataFrame({**BORINGS, **columns}, geometry=POINTS, crs="EPSG:32630")


def geojson(folder: Path, features: list[tuple[object, dict[str, object]]], **members: object) -> Path:
    """Write GeoJSON as text, so that the test knows what stands in it."""
    listed = [{"type": "Feature", "geometry": shape, "properties": values} for shape, values in features]
    content = {"type": "FeatureCollection", **members, "features": listed}
    return text_file(folder, json.dumps(content), "borings.geojson")


def point(x: float, y: float) -> dict[str, object]:
    return {"type": "Point", "coordinates": [x, y]}


def test_points_of_a_geopackage_give_x_and_y_and_the_crs(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    points().to_file(path, layer="holes")
    table = read(path, "borings")
    assert cells(table) == {
        "boring": ["BH1", "BH2"],
        "depth_m": ["6", "12.5"],
        "remarks": ["x", None],
        "x": ["500000.25", "500100"],
        "y": ["4100000.5", "4100100"],
    }
    assert (table.file, table.sheet, table.crs) == ("site.gpkg", "holes", "EPSG:32630")
    assert table.cells.index.tolist() == [1, 2]
    assert table.headings["x"].found == "geometry"
    assert table.original["geometry"].tolist() == ["POINT (500000.25 4100000.5)", "POINT (500100 4100100)"]
    assert not checks(table)


def test_values_of_a_layer_become_text_without_binary_noise(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    days = [dt.date(2024, 5, 1), None]
    more = points(single=np.array([0.1, 7.25], dtype="float32"), count=pd.array([3, None], dtype="Int64"))
    more = more.assign(day=days, moment=pd.to_datetime(["2024-05-01 00:00", "2024-05-01 08:30"]), yes=[True, False])
    more.to_file(path, layer="holes")
    original = read(path, "borings").original
    assert original[["single", "count", "day", "yes"]].values.tolist() == [
        ["0.1", "3", "2024-05-01", "TRUE"],
        ["7.25", "", "", "FALSE"],
    ]
    assert original["moment"].tolist() == ["2024-05-01", "2024-05-01T08:30:00"]


def test_a_layer_without_points_serves_a_table_that_needs_none(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    pyogrio.write_dataframe(pd.DataFrame({"boring": ["BH1"], "top_depth_m": [1.5], "LL": ["NP"]}), path, layer="lab")
    table = read(path, "samples")
    assert cells(table) == {"boring": ["BH1"], "top_depth_m": ["1.5"], "liquid_limit_pct": ["NP"]}
    assert table.crs == ""
    assert "geometry" not in table.original


def test_a_layer_of_any_shape_serves_a_table_that_needs_no_place(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    points(top=[1, 2]).to_file(path, layer="lab")
    table = read(path, "samples")
    assert list(table.cells) == ["boring", "top_depth_m"]
    assert table.original["geometry"].str.startswith("POINT").all()


def test_the_only_layer_that_fits_is_taken(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    points().to_file(path, layer="holes")
    points()[["remarks", "geometry"]].to_file(path, layer="wells")
    pyogrio.write_dataframe(pd.DataFrame(BORINGS), path, layer="no_places", append=False)
    assert read(path, "borings").sheet == "holes"


def test_layers_that_fit_alike_are_listed_and_one_may_be_named(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    points().to_file(path, layer="phase 1")
    points().to_file(path, layer="phase 2")
    with pytest.raises(InputError, match=r'2 layers that may be meant.*phase 1, phase 2.*layer = "phase 1"'):
        read(path, "borings")
    assert read(path, "borings", layer="Phase 2").sheet == "phase 2"
    assert read(path, "borings", sheet="phase 2").sheet == "phase 2"
    with pytest.raises(UsageError, match=r"layer: found 'phase 3'; allowed: phase 1, phase 2"):
        read(path, "borings", layer="phase 3")


def test_the_geometry_goes_before_coordinates_in_columns(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    points(Easting=[1, 2], lat=[3, 4]).to_file(path, layer="holes")
    table = read(path, "borings")
    assert cells(table)["x"] == ["500000.25", "500100"]
    assert table.unrecognized == ("Easting", "lat")
    assert table.findings[["topic", "heading"]].values.tolist() == [
        ["coordinates twice", "Easting"],
        ["coordinates twice", "lat"],
    ]


def test_columns_that_the_user_names_go_before_the_geometry(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    points(Easting=[1, 2], Northing=[3, 4]).to_file(path, layer="holes")
    table = read(path, "borings", columns={"x": "Easting", "y": "Northing"})
    assert (cells(table)["x"], cells(table)["y"]) == (["1", "2"], ["3", "4"])


def test_a_row_without_a_point_has_no_place(tmp_path: Path) -> None:
    rows = [
        (None, {"boring": "BH1", "depth": 5}),
        (point(7.5, 51.25), {"boring": "BH2", "depth": 6}),
        ({"type": "MultiPoint", "coordinates": [[7, 51]]}, {"boring": "BH3", "depth": 7}),
    ]
    table = read(geojson(tmp_path, rows), "borings")
    assert cells(table)["x"] == [None, "7.5", "7"]
    assert cells(table)["y"] == [None, "51.25", "51"]
    assert table.original["geometry"].tolist()[0] == ""


def test_shapes_that_are_no_points_are_refused_with_their_rows(tmp_path: Path) -> None:
    line = {"type": "LineString", "coordinates": [[0, 0], [1, 1]]}
    rows = [(point(1, 2), {"boring": "BH1", "depth": 5}), (line, {"boring": "BH2", "depth": 6})]
    with pytest.raises(InputError, match=r"1 shapes that are not points, in row 2"):
        read(geojson(tmp_path, rows), "borings")


def test_levels_in_points_are_noted(tmp_path: Path) -> None:
    shape = {"type": "Point", "coordinates": [1, 2, 30]}
    assert checks(read(geojson(tmp_path, [(shape, {"boring": "BH1", "depth": 5})]), "borings")) == {
        "levels in the geometry": "accept"
    }


def test_geojson_is_in_degrees_unless_it_says_otherwise(tmp_path: Path) -> None:
    row = {"boring": "BH1", "depth": 5}
    assert read(geojson(tmp_path, [(point(7.5, 51.25), row)]), "borings").crs == "EPSG:4326"
    stated = {"type": "name", "properties": {"name": "urn:ogc:def:crs:EPSG::32630"}}
    table = read(geojson(tmp_path, [(point(500000, 4100000), row)], crs=stated), "borings")
    assert (table.crs, table.sheet, checks(table)) == ("EPSG:32630", "", {})


def test_geojson_with_coordinates_that_cannot_be_degrees_has_no_crs(tmp_path: Path) -> None:
    table = read(geojson(tmp_path, [(point(500000, 4100000), {"boring": "BH1", "depth": 5})]), "borings")
    assert table.crs == ""
    assert cells(table)["x"] == ["500000"]
    assert checks(table) == {"coordinates not in degrees": "query"}


def test_sieves_and_decimal_numbers_of_geojson_are_read(tmp_path: Path) -> None:
    row = {"boring": "BH1", "depth_ft": 10, "P200": 12.5, "note": {"a": 1}, "tests": [1, 2]}
    table = read(geojson(tmp_path, [(None, row)]), "samples")
    assert cells(table) == {"boring": ["BH1"], "top_depth_m": ["10"], "passing_0_075_mm_pct": ["12.5"]}
    assert table.headings["top_depth_m"].factor == 0.3048


@pytest.mark.parametrize("content", ["", "[]", "{", '{"a": 1}', "boring,x,y\n", "<xml/>"])
def test_a_file_that_is_no_geojson_is_refused(tmp_path: Path, content: str) -> None:
    with pytest.raises(InputError, match=r"lab\.geojson"):
        read(text_file(tmp_path, content, "lab.geojson"), "borings")


def test_geojson_without_features_lacks_headings(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"found the headings none"):
        read(geojson(tmp_path, []), "borings")


def test_a_description_of_another_source_is_not_followed(tmp_path: Path) -> None:
    # GDAL would open such a file under any name, and what it points to.
    points().to_file(tmp_path / "site.gpkg", layer="holes")
    layer = '<OGRVRTLayer name="holes"><SrcDataSource>site.gpkg</SrcDataSource></OGRVRTLayer>'
    text = f"<OGRVRTDataSource>{layer}</OGRVRTDataSource>"
    for name in ("site.geojson", "other.gpkg", "site.shp"):
        with pytest.raises(InputError, match=r"something else"):
            read(text_file(tmp_path, text, name), "borings")


def test_a_truncated_geopackage_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "site.gpkg"
    points().to_file(path, layer="holes")
    path.write_bytes(path.read_bytes()[:2000])
    with pytest.raises(InputError, match=r"site.gpkg: found 'a file that cannot be read'"):
        read(path, "borings")


def shapefile(folder: Path) -> Path:
    path = folder / "holes.shp"
    frame = points().rename(columns={"Final depth (m)": "depth_m"})
    frame.to_file(path)
    return path


def test_points_of_a_shapefile_give_x_and_y_and_the_crs(tmp_path: Path) -> None:
    table = read(shapefile(tmp_path), "borings")
    assert cells(table)["x"] == ["500000.25", "500100"]
    assert cells(table)["depth_m"] == ["6", "12.5"]
    assert (table.crs, table.sheet) == ("EPSG:32630", "")


def test_a_shapefile_without_prj_has_no_crs(tmp_path: Path) -> None:
    path = shapefile(tmp_path)
    path.with_suffix(".prj").unlink()
    assert read(path, "borings").crs == ""


@pytest.mark.parametrize("part", [".shx", ".dbf"])
def test_a_shapefile_that_lacks_a_part_is_refused(tmp_path: Path, part: str) -> None:
    path = shapefile(tmp_path)
    path.with_suffix(part).unlink()
    with pytest.raises(InputError, match=f"found 'no holes{part}'"):
        read(path, "borings")


def test_a_coordinate_system_without_a_code_is_kept_as_text() -> None:
    own = (
        'PROJCS["Site grid",GEOGCS["WGS 84",DATUM["WGS_1984",SPHEROID["WGS 84",6378137,298.257223563]],'
        'PRIMEM["Greenwich",0],UNIT["degree",0.0174532925199433]],PROJECTION["Transverse_Mercator"],'
        'PARAMETER["latitude_of_origin",51.123],PARAMETER["central_meridian",7.456],PARAMETER["scale_factor",1],'
        'PARAMETER["false_easting",1000],PARAMETER["false_northing",2000],UNIT["metre",1]]'
    )
    assert crs_text(own) == own
    assert crs_text('GEOGCS["Undefined geographic SRS"]') == ""
