"""Workbooks: values as a spreadsheet shows them, the choice of a sheet, and damaged files."""

from __future__ import annotations

import datetime as dt
import zipfile
from collections.abc import Sequence
from pathlib import Path

import openpyxl
import pytest

from geomap.errors import InputError, UsageError
from geomap.readers import sheets, workbooks
from tests.unit.readers.reading import cells, checks, read

LAB = [["Boring", "Top depth", "LL"], ["BH1", 1.5, 35]]


def workbook(folder: Path, formats: dict[str, str] | None = None, **tables: Sequence[Sequence[object]]) -> Path:
    """Write a workbook with one sheet for each table; `formats` are number formats by cell of the first one."""
    book = openpyxl.Workbook()
    book.remove(book.worksheets[0])
    for title, rows in tables.items():
        sheet = book.create_sheet(title)
        for row in rows:
            sheet.append(list(row))
    for cell, number_format in (formats or {}).items():
        book.worksheets[0][cell].number_format = number_format
    path = folder / "lab.xlsx"
    book.save(path)
    return path


def test_numbers_become_text_without_binary_noise(tmp_path: Path) -> None:
    values = [12.0, 0.075, 0.1 + 0.2, 12, 1e-4, 4500123.456, 1e20]
    table = read(workbook(tmp_path, Lab=[["boring", "top", *"abcde"], values]))
    assert table.original.iloc[0].tolist() == ["12", "0.075", "0.3", "12", "0.0001", "4500123.456", "1e+20"]


def test_other_values_become_what_the_spreadsheet_shows(tmp_path: Path) -> None:
    moment = dt.datetime(2024, 5, 1, 8, 30)  # noqa: DTZ001 - a spreadsheet knows no time zone
    row = ["007", 1, True, dt.date(2024, 5, 1), moment, dt.time(8, 30), "#N/A", "#REF!", None]
    table = read(workbook(tmp_path, Lab=[["boring", "top", *"abcdefg"], row]))
    assert table.original.iloc[0].tolist() == [
        "007",
        "1",
        "TRUE",
        "2024-05-01",
        "2024-05-01 08:30:00",
        "08:30:00",
        "#N/A",
        "#REF!",
        "",
    ]


def test_a_number_that_became_a_date_shows_as_a_date(tmp_path: Path) -> None:
    made_by_a_spreadsheet = dt.date(2024, 3, 4)
    table = read(workbook(tmp_path, Lab=[["boring", "top", "LL"], ["BH1", made_by_a_spreadsheet, 35]]))
    assert cells(table)["top_depth_m"] == ["2024-03-04"]


def test_a_percent_format_is_applied_and_a_quoted_percent_sign_is_not(tmp_path: Path) -> None:
    rows = [["boring", "top", "LL", "PL"], ["BH1", 1, 0.355, 20.5]]
    table = read(workbook(tmp_path, {"C2": "0.0%", "D2": '0.0"%"'}, Lab=rows))
    assert cells(table)["liquid_limit_pct"] == ["35.5%"]
    assert cells(table)["plastic_limit_pct"] == ["20.5"]


def test_row_numbers_count_title_rows_gaps_and_the_units_row(tmp_path: Path) -> None:
    rows = [["Laboratory"], [], ["Boring", "Top depth", "LL"], [None, "ft", "%"], ["BH1", 5, 35], [], ["BH2", 6, 40]]
    table = read(workbook(tmp_path, Lab=rows))
    assert table.cells.index.tolist() == [5, 7]
    assert (table.file, table.sheet) == ("lab.xlsx", "Lab")
    assert table.headings["top_depth_m"].factor == 0.3048
    assert checks(table) == {"rows above the headings": "accept", "units row": "accept"}


def test_notes_beside_a_table_are_kept_without_a_heading(tmp_path: Path) -> None:
    table = read(workbook(tmp_path, Lab=[[*LAB[0]], [*LAB[1], None, "checked"]]))
    assert table.original["column E"].tolist() == ["checked"]
    assert "column D" not in table.original


def test_the_only_sheet_that_has_the_headings_is_taken(tmp_path: Path) -> None:
    path = workbook(tmp_path, Cover=[["Soils laboratory"]], Results=LAB, Empty=[])
    assert read(path).sheet == "Results"


def test_a_sheet_without_any_known_heading_is_no_choice_for_a_table_that_requires_none(tmp_path: Path) -> None:
    path = workbook(tmp_path, Cover=[["Soils laboratory"]], Results=[["LL", "PL"], [35, 20]])
    assert read(path, "lab_results").sheet == "Results"


def test_a_sheet_may_be_named_in_any_case(tmp_path: Path) -> None:
    path = workbook(tmp_path, May=LAB, June=LAB)
    assert read(path, sheet="june").sheet == "June"
    with pytest.raises(UsageError, match=r"lab.xlsx: sheet: found 'Jun'; allowed: May, June; did you mean June\?"):
        read(path, sheet="Jun")


def test_of_several_sheets_that_fit_the_one_named_as_the_table_is_taken(tmp_path: Path) -> None:
    strata = [["Boring", "Top depth", "Base depth"], ["BH1", 0, 1]]
    path = workbook(tmp_path, Samples=[["Boring", "Top depth", "Base depth", "LL"], ["BH1", 0, 1, 35]], Strata=strata)
    assert read(path, "strata").sheet == "Strata"
    assert read(path, "samples").sheet == "Samples"


def test_several_sheets_that_fit_are_listed(tmp_path: Path) -> None:
    with pytest.raises(
        InputError, match=r"found '2 sheets that may be meant'; allowed: one of May, June .*sheet = .May."
    ):
        read(workbook(tmp_path, May=LAB, Cover=[["x"]], June=LAB))


def test_where_no_sheet_fits_all_are_listed_with_the_nearest(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"one of Cover, Lab with boring, top_depth_m; Lab comes nearest"):
        read(workbook(tmp_path, Cover=[["x"]], Lab=[["Hole", "LL"], ["BH1", 35]]))


def test_a_missing_heading_names_the_sheet(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"lab.xlsx, sheet Lab, row 1: found the headings 'Hole', 'LL'"):
        read(workbook(tmp_path, Lab=[["Hole", "LL"], ["BH1", 35]]))


def test_a_formula_that_was_never_calculated_is_not_a_blank(tmp_path: Path) -> None:
    rows = [["boring", "top", "LL"], ["BH1", 1, "=20+15"], ["BH2", 2, 30], ["BH3", 3, "=C2"]]
    table = read(workbook(tmp_path, Lab=rows))
    assert cells(table)["liquid_limit_pct"] == ["=20+15", "30", "=C2"]
    finding = table.findings.iloc[0]
    assert (finding["topic"], finding["row_number"]) == ("formula without a value", 2)
    assert finding["found"].startswith("2 formulas")


def test_a_formula_with_a_value_gives_its_value(tmp_path: Path) -> None:
    path = workbook(tmp_path, Lab=[["boring", "top", "LL"], ["BH1", 1, "=20+15"], ["BH2", 2, '=""']])
    sheet = "xl/worksheets/sheet1.xml"
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    parts[sheet] = (
        parts[sheet]
        .replace(b"<f>20+15</f><v />", b"<f>20+15</f><v>35</v>")
        .replace(b'<c r="C3"><f>""</f><v />', b'<c r="C3" t="str"><f>""</f><v></v>')
    )
    assert b"<v>35</v>" in parts[sheet]
    assert b't="str"' in parts[sheet]
    with zipfile.ZipFile(path, "w") as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    table = read(path)
    assert cells(table)["liquid_limit_pct"] == ["35", None]
    assert not checks(table)


def test_a_wrong_size_in_the_file_hides_no_cell(tmp_path: Path) -> None:
    path = workbook(tmp_path, Lab=LAB)
    sheet = "xl/worksheets/sheet1.xml"
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    assert b'ref="A1:C2"' in parts[sheet]
    parts[sheet] = parts[sheet].replace(b'ref="A1:C2"', b'ref="A1"')
    with zipfile.ZipFile(path, "w") as archive:
        for name, content in parts.items():
            archive.writestr(name, content)
    assert cells(read(path))["liquid_limit_pct"] == ["35"]


@pytest.mark.parametrize("share", [0.1, 0.5, 0.9, 0.99])
def test_a_truncated_workbook_is_refused(tmp_path: Path, share: float) -> None:
    path = workbook(tmp_path, Lab=LAB)
    content = path.read_bytes()
    path.write_bytes(content[: int(len(content) * share)])
    with pytest.raises(InputError, match=r"a damaged file"):
        read(path)


def test_a_workbook_with_damage_inside_is_refused(tmp_path: Path) -> None:
    path = workbook(tmp_path, Lab=LAB)
    with zipfile.ZipFile(path) as archive:
        parts = {name: archive.read(name) for name in archive.namelist()}
    for name in ("xl/worksheets/sheet1.xml", "xl/workbook.xml", "xl/styles.xml", "[Content_Types].xml"):
        broken = tmp_path / "broken.xlsx"
        with zipfile.ZipFile(broken, "w") as archive:
            for part, content in parts.items():
                archive.writestr(part, content[: len(content) // 2] if part == name else content)
        with pytest.raises(InputError, match=r"broken.xlsx.*damaged"):
            read(broken)


def test_a_zip_archive_that_is_no_workbook_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "lab.xlsx"
    with zipfile.ZipFile(path, "w") as archive:
        archive.writestr("readme.txt", "no workbook")
    with pytest.raises(InputError, match=r"damaged"):
        read(path)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"boring,top\nBH1,1\n", "something else"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1\x1a\xe1", "an old XLS workbook, or a workbook with a password"),
        (b"", "an empty file"),
    ],
)
def test_a_file_that_is_no_workbook_is_refused(tmp_path: Path, content: bytes, message: str) -> None:
    path = tmp_path / "lab.xlsx"
    path.write_bytes(content)
    with pytest.raises(InputError, match=message):
        read(path)


def test_a_workbook_that_unpacks_beyond_all_measure_is_refused_before_it_is_unpacked(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    path = tmp_path / "lab.xlsx"
    with zipfile.ZipFile(path, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr("xl/worksheets/sheet1.xml", b"0" * (8 << 20))
    assert path.stat().st_size < 1 << 16
    monkeypatch.setattr(workbooks, "MAX_UNPACKED_BYTES", 4 << 20)
    with pytest.raises(InputError, match=r"8 MiB in 1 parts when unpacked"):
        read(path)


def test_a_sheet_wider_than_any_table_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"at most 10000"):
        read(workbook(tmp_path, Lab=[["boring", "top"] + ["x"] * 10_000]))


def test_a_sheet_with_more_cells_than_any_table_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(workbooks, "MAX_CELLS", 100)
    with pytest.raises(InputError, match=r"delete the empty rows"):
        read(workbook(tmp_path, Lab=LAB + [["BH1", 1, 2]] * 40))
    assert sheets.MAX_CELLS > 1_000_000


def test_an_empty_workbook_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"sheet Lab: found 'no filled cell'"):
        read(workbook(tmp_path, Lab=[]))
