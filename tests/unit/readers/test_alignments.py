"""The alignment out of tables of vertices and spatial files."""

from __future__ import annotations

import json
from pathlib import Path

import geopandas
import numpy as np
import openpyxl
import pytest
import shapely

from geomap.errors import InputError
from geomap.readers.alignments import RawLine
from tests.unit.readers.reading import checks, read_line, text_file

A, B, C, D = [0.0, 0.0], [10.0, 0.0], [10.0, 5.0], [20.0, 5.0]


def line_file(folder: Path, *shapes: shapely.Geometry, name: str = "line.gpkg", **columns: object) -> Path:
    path = folder / name
    geopandas.GeoDataFrame(columns, geometry=list(shapes), crs="EPSG:32630").to_file(path)
    return path


def parts(*lines: list[list[float]]) -> shapely.MultiLineString:
    return shapely.MultiLineString(lines)


@pytest.mark.parametrize("name", ["line.gpkg", "line.geojson", "line.shp"])
def test_a_line_is_read_with_its_crs(tmp_path: Path, name: str) -> None:
    line = read_line(line_file(tmp_path, shapely.LineString([A, B, C]), name=name, road=["A1"]))
    assert line.vertices.tolist() == [A, B, C]
    assert (line.file, line.crs, len(line.findings)) == (name, "EPSG:32630", 0)


def test_levels_of_a_line_are_kept_and_levels_of_zero_are_not(tmp_path: Path) -> None:
    high = read_line(line_file(tmp_path, shapely.LineString([[0, 0, 30], [10, 0, 31]])))
    assert high.vertices.tolist() == [[0, 0, 30], [10, 0, 31]]
    flat = read_line(line_file(tmp_path, shapely.LineString([[0, 0, 0], [10, 0, 0]]), name="flat.gpkg"))
    assert flat.vertices.shape == (2, 2)
    assert checks(flat) == {"no levels in the line": "accept"}


def test_parts_that_meet_end_to_end_are_joined_in_their_direction(tmp_path: Path) -> None:
    line = read_line(line_file(tmp_path, parts([B, C], [A, B], [C, D])))
    assert line.vertices.tolist() == [A, B, C, D]
    assert checks(line) == {"line in parts": "convert"}


def test_parts_drawn_against_each_other_follow_the_first_and_are_asked_about(tmp_path: Path) -> None:
    line = read_line(line_file(tmp_path, parts([A, B], [C, B], [D, C])))
    assert line.vertices.tolist() == [A, B, C, D]
    assert checks(line) == {"parts against each other": "query"}
    assert "2 drawn the other way" in line.findings["found"].iloc[0]


def test_one_part_of_a_multi_part_line_is_a_line(tmp_path: Path) -> None:
    line = read_line(line_file(tmp_path, parts([A, B, C])))
    assert line.vertices.tolist() == [A, B, C]
    assert not len(line.findings)


def test_parts_with_a_gap_are_refused_with_its_size(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"2 parts, of which 1 do not meet.*nearest gap is 5"):
        read_line(line_file(tmp_path, parts([A, B], [C, D])))


def test_a_fork_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"one connected line"):
        read_line(line_file(tmp_path, parts([A, B], [B, C], [B, D])))


def test_several_features_are_refused_by_name(tmp_path: Path) -> None:
    shapes = [shapely.LineString([A, B]), shapely.LineString([B, C])]
    with pytest.raises(InputError, match=r"found 2 features \(1: bypass; 2: old road\)"):
        read_line(line_file(tmp_path, *shapes, road=["bypass", "old road"]))


@pytest.mark.parametrize(
    ("shape", "found"), [(shapely.Point(A), "a Point"), (shapely.Polygon([A, B, C]), "a Polygon"), (None, "no line")]
)
def test_what_is_no_line_is_refused(tmp_path: Path, shape: shapely.Geometry | None, found: str) -> None:
    with pytest.raises(InputError, match=f"found '{found}'"):
        read_line(line_file(tmp_path, shape, road=["x"]))


def test_the_only_layer_of_lines_is_taken(tmp_path: Path) -> None:
    path = line_file(tmp_path, shapely.Point(A), road=["x"])
    geopandas.GeoDataFrame({"road": ["A1"]}, geometry=[shapely.LineString([A, B])], crs=32630).to_file(
        path, layer="axis"
    )
    assert read_line(path).vertices.tolist() == [A, B]
    geopandas.GeoDataFrame({"road": ["A2"]}, geometry=[shapely.LineString([C, D])], crs=32630).to_file(
        path, layer="old"
    )
    with pytest.raises(InputError, match=r"2 layers that may be meant.*axis, old"):
        read_line(path)
    assert read_line(path, layer="old").vertices.tolist() == [C, D]


def test_a_geojson_line_in_meters_without_crs_has_none(tmp_path: Path) -> None:
    feature = {
        "type": "Feature",
        "properties": {},
        "geometry": {"type": "LineString", "coordinates": [[5e5, 4e6], [5e5, 41e5]]},
    }
    path = text_file(tmp_path, json.dumps({"type": "FeatureCollection", "features": [feature]}), "line.geojson")
    line = read_line(path)
    assert line.crs == ""
    assert checks(line) == {"coordinates not in degrees": "query"}


def test_vertices_are_read_from_text_in_the_order_of_rows(tmp_path: Path) -> None:
    line = read_line(text_file(tmp_path, "No;Rechtswert;Easting;Northing\n1;a;0,5;1\n2;b;10,25;2\n"))
    assert line.vertices.tolist() == [[0.5, 1.0], [10.25, 2.0]]
    assert isinstance(line, RawLine)
    assert line.vertices.dtype == np.float64


def test_vertices_are_read_from_a_workbook(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    for row in (["x", "y"], A, B):
        book.worksheets[0].append(row)
    book.save(tmp_path / "line.xlsx")
    assert read_line(tmp_path / "line.xlsx").vertices.tolist() == [A, B]


def test_a_vertex_that_repeats_the_one_before_is_left_out_with_its_row(tmp_path: Path) -> None:
    line = read_line(text_file(tmp_path, "x,y\n0,0\n0,0.0\n10,0\n0,0\n"))
    assert line.vertices.tolist() == [[0, 0], [10, 0], [0, 0]]
    assert line.findings[["topic", "row_number"]].values.tolist() == [["vertex twice", 3]]


@pytest.mark.parametrize("cell", ["", "abc", "nan", "inf"])
def test_a_vertex_without_a_number_is_refused_with_its_row(tmp_path: Path, cell: str) -> None:
    with pytest.raises(InputError, match=r"table.csv, row 3, y: found .*a number for every vertex"):
        read_line(text_file(tmp_path, f"x,y\n0,0\n1,{cell}\n2,2\n"))


@pytest.mark.parametrize(
    ("rows", "found"), [("", "no vertex"), ("1,1\n", "one vertex"), ("1,1\n1,1\n", "2 vertices, all in one place")]
)
def test_fewer_than_two_places_are_no_line(tmp_path: Path, rows: str, found: str) -> None:
    with pytest.raises(InputError, match=f"found '?{found}'?; allowed: two vertices apart"):
        read_line(text_file(tmp_path, "x,y\n" + rows))


def test_a_table_without_coordinates_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="required for vertices: x, y; missing: y"):
        read_line(text_file(tmp_path, "x,chainage\n0,0\n"))
