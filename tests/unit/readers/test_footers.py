"""Text beneath a table is no row of it."""

from __future__ import annotations

from pathlib import Path

import openpyxl
import pytest

from tests.unit.readers.reading import checks, read, text_file

DATA = "boring,top,LL,PL\nBH-1,1.5,35,20\nBH-2,2,NP,NP\n"


def test_footers_are_left_out_with_one_note_that_names_them(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, DATA + "\nTested by: J. Doe\nNP = nonplastic,\nChecked by:,R. Roe,,\n"))
    assert table.cells.index.tolist() == [2, 3]
    assert table.original.index.tolist() == [2, 3]
    assert checks(table) == {"footer": "accept"}
    note = table.findings.iloc[0]
    assert (note["severity"], note["row_number"]) == ("note", 5)
    assert note["found"] == "Tested by: J. Doe; NP = nonplastic; Checked by: R. Roe"


def test_footers_of_a_workbook_are_left_out(tmp_path: Path) -> None:
    book = openpyxl.Workbook()
    for row in (["boring", "top", "LL"], ["BH-1", 1.5, 35], [], ["NP = nonplastic"], [], ["Tested by:", "J. Doe"]):
        book.worksheets[0].append(row)
    book.save(tmp_path / "lab.xlsx")
    assert read(tmp_path / "lab.xlsx").cells.index.tolist() == [2]


@pytest.mark.parametrize(
    "rows",
    [
        "Tested by: J. Doe\n",  # no blank row before
        "\nBH-3,,,\n",  # written like the other names: its depth is missing
        "\nBH-3,S1,,\n",
        "\nTested by:,7,,\n",  # a number
        "\nTested by: J. Doe,,,20\n",  # a value beyond the first cells
        "\nTested by: J. Doe\nBH-3,3,30,20\n",  # data follow
    ],
)
def test_what_may_be_a_row_of_the_table_stays(tmp_path: Path, rows: str) -> None:
    table = read(text_file(tmp_path, DATA + rows))
    assert len(table.cells) == 2 + len(rows.strip().splitlines())
    assert "footer" not in checks(table)


def test_a_table_of_text_only_has_no_footers(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,LL\nBH-1,35\n\nTested by: J. Doe,\n"), "lab_results")
    assert table.cells.index.tolist() == [2, 4]


def test_a_table_of_footers_only_keeps_them(tmp_path: Path) -> None:
    assert len(read(text_file(tmp_path, "boring,top,LL\n\nnone tested,\n")).cells) == 1
