"""No heading is dropped without a word: a note for all, a warning where one looks like a soil test."""

from __future__ import annotations

from pathlib import Path

import pandas as pd
import pytest

from tests.unit.readers.reading import cells, checks, read, text_file


def findings(folder: Path, headings: str, layout: str = "samples", first: str = "boring,top,LL") -> pd.DataFrame:
    """Read a table with those headings after others that are known, and return what was found."""
    line = f"{first},{headings}" if first else headings
    row = ",".join(["BH1", *"1" * line.count(",")])
    return read(text_file(folder, f"{line}\n{row}\n"), layout).findings


def test_headings_that_mean_nothing_are_one_note(tmp_path: Path) -> None:
    found = findings(tmp_path, "Weather,Driller,Sample date,Sample type,Water level")
    assert found[["topic", "action", "severity"]].values.tolist() == [["headings not read", "accept", "note"]]
    assert found["found"][0] == "'Weather', 'Driller', 'Sample date', 'Sample type', 'Water level'"
    assert found["advice"][0] == "not read; kept in the file only"


def test_a_table_whose_headings_are_all_read_has_no_such_note(tmp_path: Path) -> None:
    assert not len(findings(tmp_path, "PL,passing No. 200"))


@pytest.mark.parametrize(
    ("heading", "column"),
    [
        ("Plastc limit", "plastic_limit_pct"),
        ("limit plastic (%)", "plastic_limit_pct"),
        ("Plasticlimt", "plastic_limit_pct"),
        ("USCS", "visual_group"),
        ("Unified class", "visual_group"),
        ("Fines", "passing_0_075_mm_pct"),
        ("Swelling", "swell_pct"),
        ("Natural moisture (%)", "moisture_pct"),
        ("Corrected CBR", "cbr_pct"),
        ("Organic matter content", "organic_pct"),
    ],
)
def test_a_heading_near_a_known_one_is_a_warning_that_says_how_to_map_it(
    tmp_path: Path, heading: str, column: str
) -> None:
    found = findings(tmp_path, heading)
    assert found[["heading", "action", "severity"]].values.tolist() == [[heading, "query", "warning"]]
    assert found["advice"][0].endswith(f'rename it, or write under [samples.columns]: {column} = "{heading}"')


def test_the_advice_works_as_it_stands(tmp_path: Path) -> None:
    path = text_file(tmp_path, "boring,top,Swelling\nBH1,1,2\n")
    assert "swell_pct" not in read(path).cells
    again = read(path, columns={"swell_pct": "Swelling"})
    assert again.cells["swell_pct"].tolist() == ["2"]
    assert not len(again.findings)


@pytest.mark.parametrize("heading", ["No. 4 % retained", "Retained No. 200", "% ret. retained 4.75 mm"])
def test_percent_retained_is_not_read_and_percent_passing_is_asked_for(tmp_path: Path, heading: str) -> None:
    found = findings(tmp_path, heading)
    assert found[["topic", "heading", "severity"]].values.tolist() == [["percent retained", heading, "warning"]]
    assert "percent retained is not read; give percent passing" in found["advice"][0]


def test_gravel_and_sand_are_not_read_because_their_limits_differ(tmp_path: Path) -> None:
    found = findings(tmp_path, "% Gravel,Sand content (%),Silt & clay (%)")
    assert found["topic"].tolist() == ["soil fraction not read"] * 3
    assert found["advice"].str.contains("size limits of this fraction differ between standards").all()


def test_beside_a_curve_fractions_are_only_noted(tmp_path: Path) -> None:
    found = findings(tmp_path, "% Gravel,% Sand,% Fines,passing No. 4,passing No. 200")
    assert found[["topic", "found"]].values.tolist() == [["headings not read", "'% Gravel', '% Sand', '% Fines'"]]


@pytest.mark.parametrize("heading", ["% Fines", "Fines (%)", "fines_pct", "Percent fines", "Fines content (%)"])
def test_percent_fines_is_percent_passing_0_075_mm_and_said_so(tmp_path: Path, heading: str) -> None:
    table = read(text_file(tmp_path, f"boring,top,{heading}\nBH1,1,12\n"))
    assert cells(table)["passing_0_075_mm_pct"] == ["12"]
    assert checks(table) == {"percent fines": "convert"}


def test_percent_fines_beside_percent_passing_0_075_mm_gives_way(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top,% Fines,P200\nBH1,1,12,13\n"))
    assert table.headings["passing_0_075_mm_pct"].found == "P200"
    assert table.unrecognized == ("% Fines",)


def test_a_heading_about_a_test_or_of_geomap_itself_is_only_noted(tmp_path: Path) -> None:
    found = findings(tmp_path, "Sieve date,Proctor method,uscs_symbol,gravel_pct")
    assert found["topic"].tolist() == ["headings not read"]


def test_a_heading_whose_column_is_already_read_is_only_noted(tmp_path: Path) -> None:
    assert findings(tmp_path, "Liqiud limit,USCS,field group")["topic"].tolist() == ["headings not read"]


def test_in_other_tables_headings_near_a_known_one_are_warned_of(tmp_path: Path) -> None:
    found = findings(tmp_path, "Grond level,CBR", "borings", "boring,x,y,depth")
    assert found[["severity", "heading"]].fillna("").values.tolist() == [["note", ""], ["warning", "Grond level"]]
    assert '[borings.columns]: ground_level_m = "Grond level"' in found["advice"][1]


@pytest.mark.parametrize(("layout", "is_warned"), [("samples", True), ("lab_results", True), ("strata", False)])
def test_a_table_of_samples_without_any_soil_test_is_a_warning(tmp_path: Path, layout: str, is_warned: bool) -> None:
    table = read(text_file(tmp_path, "boring,top,base,description\nBH1,1,2,clay\n"), layout)
    assert checks(table) == ({"no soil test": "query"} if is_warned else {})


@pytest.mark.parametrize("heading", ["visual group", "No. 200", "LL", "SPT N", "NP"])
def test_one_soil_test_or_a_visual_group_is_enough(tmp_path: Path, heading: str) -> None:
    assert not checks(read(text_file(tmp_path, f"boring,top,{heading}\nBH1,1,2\n")))
