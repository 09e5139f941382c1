"""One table, written in every format that geomap reads, gives the same cells."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import geopandas
import openpyxl
import pandas as pd
import pytest
import shapely

from geomap.readers import borings
from geomap.readers.options import TableOptions
from geomap.registry import for_file
from geomap.tables.raw import RawTable

# Constructed; every kind of cell that a table of borings has.
BORINGS = pd.DataFrame(
    {
        "boring": ["BH-1", "TP-2", "007"],
        "x": [504246.82, 504394.15, 504548.71],
        "y": [5112471.29, 5112629.02, 5112838.21],
        "depth_m": [6.0, 3.25, 12.0],
        "date": ["2025-03-10", None, "2025-03-12"],
        "remarks": ['roots, "fat" clay', None, "ärmlich ½"],
    }
)


def text(encoding: str, delimiter: str, decimal: str = ".") -> Callable[[Path], None]:
    def write(path: Path) -> None:
        BORINGS.to_csv(path, index=False, encoding=encoding, sep=delimiter, decimal=decimal)

    return write


def workbook(path: Path) -> None:
    book = openpyxl.Workbook()
    book.worksheets[0].append(list(BORINGS))
    for row in BORINGS.astype(object).where(BORINGS.notna(), None).values.tolist():
        book.worksheets[0].append(row)
    book.save(path)


def layer(path: Path) -> None:
    points = [shapely.Point(xy) for xy in BORINGS[["x", "y"]].to_numpy()]
    geopandas.GeoDataFrame(BORINGS.drop(columns=["x", "y"]), geometry=points, crs="EPSG:32626").to_file(path)


WRITERS: dict[str, Callable[[Path], None]] = {
    "borings.csv": text("utf-8", ","),
    "borings_marked.csv": text("utf-8-sig", ","),
    "borings_semicolon.csv": text("cp1252", ";", ","),
    "borings.tsv": text("utf-16", "\t"),
    "borings.txt": text("utf-8", "|"),
    "borings.xlsx": workbook,
    "borings.gpkg": layer,
    "borings.geojson": layer,
    "borings.json": layer,
    "borings.shp": layer,
}


def read(path: Path) -> RawTable:
    return for_file(borings.FORMATS, path, "test").read(path, "borings", TableOptions())


@pytest.mark.parametrize("name", WRITERS)
def test_the_cells_do_not_depend_on_the_format(tmp_path: Path, name: str) -> None:
    path = tmp_path / name
    WRITERS[name](path)
    table = read(path)
    expected = pd.DataFrame(
        {
            "boring": ["BH-1", "TP-2", "007"],
            "x": ["504246.82", "504394.15", "504548.71"],
            "y": ["5112471.29", "5112629.02", "5112838.21"],
            "depth_m": ["6.0" if path.suffix in (".csv", ".tsv", ".txt") else "6", "3.25", "12"],
            "date": ["2025-03-10", None, "2025-03-12"],
            "remarks": ['roots, "fat" clay', None, "ärmlich ½"],
        },
        dtype="string",
    )
    if path.suffix in (".csv", ".tsv", ".txt"):
        expected.loc[2, "depth_m"] = "12.0"
    found = table.cells[list(expected)].reset_index(drop=True)
    pd.testing.assert_frame_equal(found, expected)
    assert (table.cells.dtypes == "string").all()
    assert (table.original.dtypes == "string").all()
    assert table.file == name
    assert table.unrecognized == ()


def test_every_ending_that_is_read_is_tried_here() -> None:
    endings = {ending for member in borings.FORMATS for ending in member.SUFFIXES}
    assert {Path(name).suffix for name in WRITERS} == endings - {".xlsm"}  # an XLSX workbook with macros
