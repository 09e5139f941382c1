"""From cells of text to typed columns: units, censoring, and what a reader of the findings sees."""

from __future__ import annotations

import dataclasses

import pandas as pd
import pytest

from geomap.intake import accept, screen
from geomap.tables import schema
from tests.unit.intake.written import asked, checks, clean, dirty, raw


def test_clean_tables_give_no_findings_and_leave_nothing_out() -> None:
    taken = screen(accept(clean()))
    assert taken.findings.empty
    assert taken.counts()["left_out"].sum() == 0
    assert taken.counts()["read"].tolist() == [3, 4, 5, 4]


def test_typed_tables_have_the_columns_of_their_layout_and_say_where_each_row_was_read() -> None:
    rows = accept(clean()).rows("borings")
    assert rows.columns.tolist() == [
        *schema.inputs()["borings"].columns,
        "file",
        "sheet",
        "row_number",
        "status",
        "reason",
    ]
    assert rows["row_number"].tolist() == [2, 3, 4]
    assert set(rows["file"]) == {"borings.csv"}


def test_the_unit_of_a_heading_is_applied_once_and_said_once_for_its_column() -> None:
    text = "boring | x | y | depth_ft:depth_m:ft\nBH-1 | 1 | 2 | 20\nBH-2 | 3 | 4 | 30"
    taken = accept([raw("borings", text)])
    assert taken.rows("borings")["depth_m"].tolist() == pytest.approx([6.096, 9.144])
    said = asked(taken, "unit of the heading")
    assert len(said) == 1
    assert said.iloc[0]["heading"] == "depth_ft"
    assert said.iloc[0]["advice"] == "each value was multiplied by 0.3048 to m"


def test_a_range_is_checked_after_conversion_and_said_in_the_unit_of_the_file() -> None:
    taken = accept([raw("borings", "boring | depth_ft:depth_m:ft\nBH-1 | 1600\nBH-2 | 1700")])
    assert taken.rows("borings")["depth_m"].notna().tolist() == [True, False]
    said = asked(taken, "out of range").iloc[0]
    assert (said["found"], said["allowed"], said["row_number"]) == ("1700", "0 to 1640.42 (ft)", 3)


# Defect 32: CBR given as '<2' or '>100'.
def test_a_censored_cbr_keeps_its_bound() -> None:
    taken = accept([raw("samples", "boring | CBR:cbr_soaked_pct\nBH-1 | <2\nBH-2 | 5\nBH-3 | >100")])
    rows = taken.rows("samples")
    assert rows["cbr_soaked_pct"].tolist() == [2, 5, 100]
    assert rows["cbr_soaked_pct_bound"].fillna("").tolist() == ["<", "", ">"]
    assert taken.findings.empty


# Defect 41: a spreadsheet has turned '3-4' into a date, 1E05 into a number, and dropped leading zeros.
def test_entries_that_a_spreadsheet_has_changed_are_rejected_and_dropped_zeros_are_asked_about() -> None:
    samples = """
    boring | sample | top_depth_m | PI:plasticity_index_pct
    BH-1   | 3-Apr  | 1           | 12
    BH-1   | 1E+05  | 2           | 2026-04-03
    BH-1   | 007    | 3           |
    BH-1   | 8      | 4           | 4
    """
    taken = screen(accept(dirty(samples=samples, gradations="")))
    names = asked(taken, "name changed by a spreadsheet")
    assert names["found"].tolist() == ["3-Apr", "1E+05"]
    assert set(names["action"]) == {"reject"}
    assert asked(taken, "date in place of a number").iloc[0]["heading"] == "PI"
    zeros = asked(taken, "zeros may be lost")
    assert (zeros.iloc[0]["found"], zeros.iloc[0]["action"]) == ("8", "query")
    assert taken.used("samples")["sample"].fillna("").tolist() == ["", "", "007", "8"]


# Defect 22: missing stored as -999.
def test_a_code_for_no_result_becomes_missing_and_is_said() -> None:
    taken = accept([raw("samples", "boring | w:moisture_pct\nBH-1 | -999\nBH-2 | 12")])
    assert taken.rows("samples")["moisture_pct"].isna().tolist() == [True, False]
    assert asked(taken, "code for no result").iloc[0]["found"] == "-999"


def test_a_note_that_would_repeat_is_given_once_with_its_rows() -> None:
    cells = "\n".join(["BH-1 | n/a"] * 25 + ["BH-1 | 12"])
    taken = accept([raw("samples", f"boring | LL:liquid_limit_pct\n{cells}")])
    assert taken.findings["found"].tolist() == ["n/a (in 25 rows: 2-26)"]
    assert taken.findings.loc[0, "boring"] == "BH-1"


def test_notes_of_many_different_texts_are_given_once_too() -> None:
    cells = "\n".join(f"BH-1 | {n / 10} m" for n in range(25))
    taken = accept([raw("samples", f"boring | top:top_depth_m\n{cells}")])
    assert taken.findings["found"].tolist() == ["0.0 m and others (in 25 rows: 2-26)"]


def test_errors_are_given_one_by_one() -> None:
    cells = "\n".join(["BH-1 | 900"] * 25)
    assert len(asked(accept([raw("samples", f"boring | LL:liquid_limit_pct\n{cells}")]), "out of range")) == 25


def test_sheets_of_one_layout_follow_each_other_and_findings_name_the_right_one() -> None:
    first = raw("samples", "boring | top_depth_m | LL:liquid_limit_pct\nBH-1 | 1 | 30", "lab.xlsx", "Lab A")
    second = raw(
        "samples",
        "boring | top_depth_m | WL:liquid_limit_pct | PL:plastic_limit_pct\nBH-2 | 1 | 20 | 30",
        "lab.xlsx",
        "Lab B",
    )
    taken = screen(accept([first, second]))
    assert taken.rows("samples")["sheet"].tolist() == ["Lab A", "Lab B"]
    said = asked(taken, "liquid limit below plastic limit").iloc[0]
    assert (said["sheet"], said["heading"], said["found"]) == ("Lab B", "WL, PL", "WL 20, PL 30")


def test_findings_of_the_reader_stand_before_those_on_its_values() -> None:
    table = raw("samples", "boring | ph\nBH-1 | 20")
    before = pd.DataFrame({"file": ["samples.csv"], "topic": ["heading not known"], "found": ["Weather"]})
    taken = accept([dataclasses.replace(table, findings=before)])
    assert taken.findings["topic"].tolist() == ["heading not known", "out of range"]


def test_the_input_is_left_as_it_was() -> None:
    tables = dirty(samples="boring | top_depth_m | LL:liquid_limit_pct\nBH-1 | 1 | 0\nBH-9 | x | 20")
    before = [table.cells.copy() for table in tables]
    screen(accept(tables))
    for table, cells in zip(tables, before, strict=True):
        pd.testing.assert_frame_equal(table.cells, cells)


def test_an_empty_table_is_no_trouble() -> None:
    empty = [raw("borings", "boring | x | y | depth_m"), raw("samples", "boring | top_depth_m")]
    taken = screen(accept(empty))
    assert checks(taken) == set()
    assert taken.counts()["read"].tolist() == [0, 0, 0]
