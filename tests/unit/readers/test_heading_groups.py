"""Headings in two rows are read as one row, or refused in words; never read as data."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest

from geomap.errors import InputError
from tests.unit.readers.reading import cells, checks, read, text_file

GROUPED = "Boring,Depth from (m),Depth to,Percent passing,,,LL\n,,,3/4 in,No. 4,No. 10,\nBH1,1,2,100,90,80,30\n"
COLUMNS = ["boring", "top_depth_m", "base_depth_m"]
CURVE = ["passing_19_mm_pct", "passing_4_75_mm_pct", "passing_2_mm_pct"]


def test_sieves_beneath_a_group_are_read_and_the_row_is_no_sample(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, GROUPED))
    assert list(table.cells) == [*COLUMNS, *CURVE, "liquid_limit_pct"]
    assert table.cells.index.tolist() == [3]
    assert cells(table)["passing_4_75_mm_pct"] == ["90"]
    note = table.findings.iloc[0]
    assert checks(table) == {"headings in two rows": "accept"}
    assert (note["severity"], note["row_number"]) == ("note", 1)
    assert "Percent passing" in note["found"]


def test_merged_cells_of_a_workbook_fill_to_the_right_and_down(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    sheet = book.worksheets[0]
    sheet.append(["Laboratory report"])
    sheet.append(["Boring", "Depth (ft)", None, "Percent passing", None, None, "LL"])
    sheet.append([None, "From", "To", "3/4 in", "No. 4", "No. 10"])
    sheet.append(["BH1", 1.5, 3, 100, 90, 80, 30])
    for area in ("A2:A3", "B2:C2", "D2:F2", "G2:G3"):
        sheet.merge_cells(area)
    book.create_sheet("other").append(["nothing"])
    book.save(tmp_path / "lab.xlsx")
    table = read(tmp_path / "lab.xlsx")
    assert list(table.cells) == [*COLUMNS, *CURVE, "liquid_limit_pct"]
    assert table.cells.index.tolist() == [4]
    assert table.headings["base_depth_m"].factor == 0.3048
    assert list(checks(table)) == ["rows above the headings", "headings in two rows"]


def test_a_group_gives_its_members_their_unit(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, ",Depth (ft),,\nBoring,From,To,LL\nBH1,5,6,30\n"))
    assert table.headings["top_depth_m"].factor == table.headings["base_depth_m"].factor == 0.3048
    assert list(table.original) == ["Boring", "Depth From (ft)", "Depth To (ft)", "LL"]


@pytest.mark.parametrize(
    ("upper", "lower", "column"),
    [
        ("Percent passing (mm)", "4.75", "passing_4_75_mm_pct"),
        ("% finer", "200", "passing_0_075_mm_pct"),
        ("CBR (%)", "Soaked", "cbr_soaked_pct"),
        ("Field", "group", "visual_group"),
        ("Swell", "%", "swell_pct"),
    ],
)
def test_words_of_both_rows_are_put_together(tmp_path: Path, upper: str, lower: str, column: str) -> None:
    table = read(text_file(tmp_path, f"Boring,Top,{upper},,PL\n,,{lower},No. 40,\nBH1,1,5,6,7\n"))
    assert cells(table)[column] == ["5"]
    assert len(table.cells) == 1


def test_a_required_heading_in_two_rows_is_found(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "Borehole,Sample,,Depth\nNo.,No.,LL,m\nBH1,S1,30,1.5\n"))
    assert cells(table) == {
        "boring": ["BH1"],
        "sample": ["S1"],
        "liquid_limit_pct": ["30"],
        "top_depth_m": ["1.5"],
    }


def test_a_units_row_may_follow_two_rows_of_headings(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "Boring,Depth,,LL\n,From,To,\n,ft,ft,%\nBH1,5,6,30\n"))
    assert table.headings["top_depth_m"].factor == 0.3048
    assert table.cells.index.tolist() == [4]


@pytest.mark.parametrize("at_top", [True, False])
def test_sieves_beneath_percent_retained_are_not_taken_for_passing(tmp_path: Path, at_top: bool) -> None:
    names = "Boring,Top,{},LL"
    upper, lower = (names, ",,{},") if at_top else (",,{},", names)
    text = f"{upper.format('Percent retained,')}\n{lower.format('3/4 in,No. 4')}\nBH1,1,5,6,30\n"
    table = read(text_file(tmp_path, text))
    assert list(table.cells) == ["boring", "top_depth_m", "liquid_limit_pct"]
    retained = table.findings.loc[table.findings["topic"] == "percent retained", "heading"]
    assert retained.tolist() == ["Percent retained 3/4 in", "Percent retained No. 4"]


def test_a_title_that_speaks_of_retained_is_no_group(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "Test of percent retained,,,\nBoring,Top,3/4 in,No. 4\nBH1,1,100,90\n"))
    assert list(table.cells) == [*COLUMNS[:2], *CURVE[:2]]
    assert checks(table) == {"rows above the headings": "accept"}


@pytest.mark.parametrize(
    ("text", "shown"),
    [
        ("Boring,Top,LL,Sieves,\n(ours),,,3/4 in,No. 4\nBH1,1,30,100,90\n", "3/4 in, No. 4"),
        ("Boring,Top,LL,Percent passing,\n,,,40,10\nBH1,1,30,5,90\n", "40, 10"),
    ],
)
def test_a_second_row_of_headings_that_cannot_be_joined_is_refused(tmp_path: Path, text: str, shown: str) -> None:
    with pytest.raises(InputError, match=rf"row 2: found 'a second row of headings: {shown}'.*whole in one row"):
        read(text_file(tmp_path, text))


@pytest.mark.parametrize(
    "row",
    ["BH1,1,clay,100,90", "BH1,,clay,100,90", ",1,clay,100,90", "boring,top,description,3/4 in,No. 4", "BH1,,clay,,"],
)
def test_the_first_row_of_data_is_never_taken_for_headings(tmp_path: Path, row: str) -> None:
    table = read(text_file(tmp_path, f"boring,top,description,3/4 in,No. 4\n{row}\nBH2,2,sand,100,80\n"))
    assert table.cells.index.tolist() == [2, 3]
    assert not checks(table)


def test_words_above_that_add_nothing_are_rows_above_the_headings(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, ",,Limits,\nBoring,Top,LL,PL\nBH1,1,30,20\n"))
    assert checks(table) == {"rows above the headings": "accept"}
    assert list(table.original) == ["Boring", "Top", "LL", "PL"]


def test_a_heading_of_the_users_own_may_be_of_both_rows(tmp_path: Path) -> None:
    path = text_file(tmp_path, "Boring,Top,Percent passing,,Fall cone\n,,3/4 in,No. 4,w\nBH1,1,100,90,35\n")
    table = read(path, columns={"liquid_limit_pct": "Fall cone w"})
    assert cells(table)["liquid_limit_pct"] == ["35"]
