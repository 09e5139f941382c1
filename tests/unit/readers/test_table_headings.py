"""Heading rows, units rows, the user's own headings, and what is said when they do not answer."""

from __future__ import annotations

from pathlib import Path

import pytest

from geomap.errors import InputError, UsageError
from geomap.tables.raw import Heading
from tests.unit.readers.reading import cells, checks, read, text_file

LAB = "boring,top depth,LL\nBH1,1.5,35\n"


def test_headings_are_found_beneath_a_title_block_and_row_numbers_are_those_of_a_spreadsheet(tmp_path: Path) -> None:
    table = read(
        text_file(tmp_path, "Soils laboratory,,\n,,\nReport 7,,\nBoring,Top depth,LL\n,,\nBH1,1.5,35\nBH2,2,40\n")
    )
    assert table.cells.index.tolist() == [6, 7]
    assert table.cells.index.name == "row_number"
    assert cells(table) == {
        "boring": ["BH1", "BH2"],
        "top_depth_m": ["1.5", "2"],
        "liquid_limit_pct": ["35", "40"],
    }
    note = table.findings.iloc[0]
    assert (note["topic"], note["row_number"], note["found"]) == ("rows above the headings", 1, "Soils laboratory")


def test_the_row_with_all_required_headings_goes_before_one_with_more(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "LL,PL,PI,MC,pH\nboring,top,x1,x2,x3\nBH1,2,1,1,1\n"))
    assert list(table.cells) == ["boring", "top_depth_m"]


def test_of_two_equal_rows_the_first_holds_the_headings(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, LAB + "boring,top depth,LL\nBH2,1,2\n"))
    assert table.cells["boring"].tolist() == ["BH1", "boring", "BH2"]  # a second table is for intake to see


def test_headings_beyond_the_searched_rows_are_not_found(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="missing: boring"):
        read(text_file(tmp_path, "title\n" * 30 + LAB))


def test_a_units_row_gives_the_units_and_is_no_sample(tmp_path: Path) -> None:
    table = read(
        text_file(tmp_path, "boring,top depth,base depth,LL,UCS,remark\n,(ft),ft,%,psf,-\nBH1,5,6,35,2000,x\n")
    )
    assert table.cells.index.tolist() == [3]
    assert table.headings["top_depth_m"] == Heading("top depth", "top_depth_m", 0.3048, "ft")
    assert table.headings["unconfined_kpa"].unit == "psf"
    row = table.findings.iloc[0]
    assert (row["topic"], row["row_number"]) == ("units row", 2)


def test_a_row_of_dashes_is_no_units_row(tmp_path: Path) -> None:
    assert len(read(text_file(tmp_path, "boring,top depth,LL\n-,-,-\nBH1,5,6\n")).cells) == 2


def test_a_units_row_that_agrees_with_the_headings_is_accepted(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top_depth_ft,LL\n,feet,%\nBH1,5,6\n"))
    assert table.headings["top_depth_m"].factor == 0.3048


@pytest.mark.parametrize("heading", ["top_depth_m", "Top depth (m)"])
def test_a_units_row_that_contradicts_a_heading_is_refused_and_both_are_named(tmp_path: Path, heading: str) -> None:
    with pytest.raises(InputError, match=r"row 1, '(?i:top).*found 'm in the heading, ft beneath'.*one unit"):
        read(text_file(tmp_path, f"boring,{heading},LL\n,ft,%\nBH1,5,6\n"))


def test_a_units_row_with_a_unit_of_another_kind_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="units row under 'LL': found 'kPa'"):
        read(text_file(tmp_path, "boring,top depth,LL\n,m,kPa\nBH1,5,6\n"))


def test_the_corridors_length_unit_counts_only_where_the_file_states_none(tmp_path: Path) -> None:
    path = text_file(tmp_path, "boring,top depth,base_depth_m,D10,LL\nBH1,5,6,0.1,35\n")
    table = read(path, length_unit="us-ft")
    assert table.headings["top_depth_m"].factor == 1200 / 3937
    assert table.headings["base_depth_m"].factor == 1.0
    assert table.headings["d10_mm"].factor == 1.0
    assert table.findings[["topic", "heading", "action"]].values.tolist() == [["length unit", "top depth", "convert"]]
    assert read(path).headings["top_depth_m"].factor == 1.0
    assert not len(read(path).findings)


def test_a_units_row_goes_before_the_corridors_length_unit(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top depth,LL\n,m,%\nBH1,5,6\n"), length_unit="ft")
    assert table.headings["top_depth_m"] == Heading("top depth", "top_depth_m", 1.0, "m")
    assert "length unit" not in checks(table)


def test_an_unknown_length_unit_is_refused(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="found 'yd'; allowed: m, ft, us-ft"):
        read(text_file(tmp_path, LAB), length_unit="yd")


def test_two_headings_for_one_column_are_refused_and_both_are_named(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"LL \(column C\) and Liquid limit \(column D\).*liquid_limit_pct"):
        read(text_file(tmp_path, "boring,top,LL,Liquid limit\nBH1,1,2,3\n"))


def test_two_names_of_one_sieve_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"P200 \(column C\) and passing 75 um \(column D\)"):
        read(text_file(tmp_path, "boring,top,P200,passing 75 um\nBH1,1,2,3\n"))


def test_a_heading_of_the_users_own_goes_before_aliases(tmp_path: Path) -> None:
    path = text_file(tmp_path, "Bohrung,Teufe (ft),LL,Liquid limit,Sieb 0063\nBH1,5,30,31,12\n")
    table = read(
        path,
        columns={
            "boring": "bohrung",
            "top_depth_m": "Teufe (ft)",
            "liquid_limit_pct": "Liquid limit",
            "passing_0.063_mm_pct": "Sieb 0063",
        },
    )
    assert cells(table) == {
        "boring": ["BH1"],
        "top_depth_m": ["5"],
        "liquid_limit_pct": ["31"],
        "passing_0_063_mm_pct": ["12"],
    }
    assert table.headings["top_depth_m"].factor == 0.3048
    assert table.unrecognized == ("LL",)


def test_a_heading_of_the_users_own_that_is_not_there_is_refused_with_the_nearest(tmp_path: Path) -> None:
    with pytest.raises(
        UsageError, match=r"columns.liquid_limit_pct: found 'Liquid limt'; .*did you mean 'Liquid limit'\?"
    ):
        read(text_file(tmp_path, "boring,top,Liquid limit\nBH1,1,2\n"), columns={"liquid_limit_pct": "Liquid limt"})


def test_a_column_that_the_table_does_not_have_is_refused_with_the_nearest(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match=r"found 'liquid_limit'; .*did you mean liquid_limit_pct\?"):
        read(text_file(tmp_path, LAB), columns={"liquid_limit": "LL"})


def test_one_heading_for_two_columns_is_refused(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="each heading once"):
        read(text_file(tmp_path, LAB), columns={"liquid_limit_pct": "LL", "plastic_limit_pct": "ll"})


def test_a_missing_heading_is_explained(tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        read(text_file(tmp_path, "Borng,Top depth (yd),LL\nBH1,1,2\n"))
    text = str(caught.value)
    assert "table.csv, row 1: found the headings 'Borng', 'Top depth (yd)', 'LL'" in text
    assert "required for samples: boring, top_depth_m" in text
    assert "boring (or boring id, borehole" in text
    assert "did you mean 'Borng' for boring?" in text
    assert "the unit in 'Top depth (yd)' is not one of top_depth_m: m, meter" in text
    assert 'columns = { boring = "your heading" }' in text


def test_a_table_that_requires_no_heading_still_needs_one_that_is_known(tmp_path: Path) -> None:
    assert list(read(text_file(tmp_path, "Weather,LL\nrain,35\n"), "lab_results").cells) == ["liquid_limit_pct"]
    with pytest.raises(
        InputError, match="found the headings 'Weather', 'Day'; allowed: one at least of boring, sample"
    ):
        read(text_file(tmp_path, "Weather,Day\nrain,35\n"), "lab_results")


def test_an_unknown_unit_on_a_column_that_is_not_required_is_a_finding(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top,LL,UCS (bar)\nBH1,1,30,2\n"))
    assert "unconfined_kpa" not in table.cells
    assert table.unrecognized == ("UCS (bar)",)
    assert checks(table) == {"unit of the heading not known": "hold_out"}


def test_headings_that_mean_nothing_are_kept_and_listed(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,Weather,top,,Weather,LL\nBH1,rain,1,odd,sun,30\nBH2,,2,,,\n"))
    assert list(table.original) == ["boring", "Weather", "top", "column D", "Weather (2)", "LL"]
    assert table.unrecognized == ("Weather", "column D", "Weather (2)")
    assert table.original["column D"].tolist() == ["odd", ""]
    assert checks(table) == {"heading twice": "accept", "headings not read": "accept"}
    assert table.findings["found"].tolist() == ["Weather", "'Weather', 'column D'"]


def test_a_sieve_by_number_without_a_sign_is_noted(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top,P10,P200,No. 40\nBH1,1,2,3,4\n"))
    assert table.findings[["topic", "heading"]].values.tolist() == [["sieve number", "P10"]]


def test_originals_keep_every_cell_as_found(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, 'boring,note,top,LL\n BH1 ," as found ",1.50,np\n'))
    assert table.original.values.tolist() == [[" BH1 ", " as found ", "1.50", "np"]]
    assert cells(table)["boring"] == ["BH1"]
    assert table.cells.index.equals(table.original.index)


def test_a_table_with_headings_only_is_empty(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top,LL\n"))
    assert table.cells.shape == (0, 3)
    assert (table.cells.dtypes == "string").all()


def test_a_blank_cell_is_missing_and_a_short_row_has_blanks(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top,LL\nBH1, \nBH2,1,  \n"))
    assert cells(table) == {"boring": ["BH1", "BH2"], "top_depth_m": [None, "1"], "liquid_limit_pct": [None, None]}
