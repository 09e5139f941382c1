"""Levels along the line."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest

from geomap.errors import InputError, UsageError
from geomap.readers import alignments, borings, surfaces
from geomap.readers.options import TableOptions
from geomap.registry import for_file
from geomap.tables.raw import RawTable
from tests.unit.readers.reading import cells, text_file


def read_levels(path: Path, **options: object) -> RawTable:
    return for_file(surfaces.FORMATS, path, "test").read(path, "levels", TableOptions(**options))


@pytest.mark.parametrize(
    ("headings", "column"),
    [
        ("Chainage,Level (m)", "chainage"),
        ("Station,Elevation", "chainage"),
        ("distance_m,Formation level", "distance_m"),
    ],
)
def test_levels_are_read_by_chainage_or_distance(tmp_path: Path, headings: str, column: str) -> None:
    table = read_levels(text_file(tmp_path, headings + "\n0,10.5\n20,10.25\n"))
    assert cells(table) == {column: ["0", "20"], "level_m": ["10.5", "10.25"]}


def test_levels_in_feet_have_their_factor(tmp_path: Path) -> None:
    table = read_levels(text_file(tmp_path, "station,level_ft,width\n12+00,100,40\n"), length_unit="ft")
    assert table.headings["level_m"].factor == table.headings["width_m"].factor == 0.3048


def test_levels_are_read_from_a_workbook(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    for row in (["Chainage", "Level"], ["12+400", 34.5]):
        book.worksheets[0].append(row)
    book.save(tmp_path / "levels.xlsx")
    assert cells(read_levels(tmp_path / "levels.xlsx")) == {"chainage": ["12+400"], "level_m": ["34.5"]}


def test_levels_without_a_place_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"no heading for a place.*distance_m or chainage"):
        read_levels(text_file(tmp_path, "point,level\n1,10\n"))


def test_ground_and_design_level_in_one_file_must_be_told_apart(tmp_path: Path) -> None:
    path = text_file(tmp_path, "chainage,ground level,formation level\n0,10,9\n")
    with pytest.raises(InputError, match=r"ground level .*and formation level"):
        read_levels(path)
    assert cells(read_levels(path, columns={"level_m": "formation level"}))["level_m"] == ["9"]


@pytest.mark.parametrize(
    "family", [borings.FORMATS, alignments.FORMATS, surfaces.FORMATS], ids=["tables", "lines", "levels"]
)
def test_formats_have_names_titles_and_endings_of_their_own(family: tuple[borings.TableFormat, ...]) -> None:
    names = [member.NAME for member in family]
    endings = [ending for member in family for ending in member.SUFFIXES]
    assert len(set(names)) == len(names)
    assert len(set(endings)) == len(endings)
    assert all(ending.startswith(".") and ending == ending.lower() for ending in endings)
    assert all(member.TITLE for member in family)


def test_an_ending_that_cannot_be_read_is_refused_with_those_that_can(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match=r"found 'lab.pdf'; allowed: a file ending in .csv, .geojson, .gpkg"):
        for_file(borings.FORMATS, tmp_path / "lab.pdf", "corridor.toml")
