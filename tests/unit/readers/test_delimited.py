"""Text tables: encodings, delimiters, quotes, decimal commas, and files that are no text."""

from __future__ import annotations

from pathlib import Path

import pytest

from geomap.errors import InputError, UsageError
from geomap.readers import files
from tests.unit.readers.reading import cells, checks, read, text_file

TEXT = "boring,top,description,LL\nSö1,1.5,Lehm µ ½,30\n"


@pytest.mark.parametrize("encoding", ["utf-8", "utf-8-sig", "utf-16", "utf-32"])
def test_unicode_is_read_with_or_without_its_mark(tmp_path: Path, encoding: str) -> None:
    table = read(text_file(tmp_path, TEXT, encoding=encoding))
    assert cells(table)["boring"] == ["Sö1"]
    assert next(iter(table.original)) == "boring"
    assert not checks(table)


@pytest.mark.parametrize("mark", [b"\xff\xfe", b"\xfe\xff"])
def test_utf_16_is_read_in_both_byte_orders(tmp_path: Path, mark: bytes) -> None:
    path = tmp_path / "table.txt"
    path.write_bytes(mark + TEXT.encode("utf-16-le" if mark == b"\xff\xfe" else "utf-16-be"))
    assert cells(read(path))["description"] == ["Lehm µ ½"]


def test_windows_text_is_read_and_said_so(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,top,description,LL\nSö1,1.5,8 ± 10 €,30\n", encoding="cp1252"))
    assert cells(table)["description"] == ["8 ± 10 €"]
    assert checks(table) == {"text encoding": "accept"}


def test_bytes_that_windows_lacks_are_read_as_latin_1(tmp_path: Path) -> None:
    path = tmp_path / "table.csv"
    path.write_bytes(b"boring,top\nS\xf6\x81,1\n")
    assert cells(read(path))["boring"] == ["Sö\x81"]


@pytest.mark.parametrize("delimiter", [",", ";", "\t", "|"])
@pytest.mark.parametrize("ending", ["\n", "\r\n", "\r"])
def test_the_delimiter_is_found_with_any_line_end(tmp_path: Path, delimiter: str, ending: str) -> None:
    rows = [["boring", "top", "description"], ["BH1", "1.5", "clay"], ["BH2", "2.5", "sand"]]
    table = read(text_file(tmp_path, ending.join(delimiter.join(row) for row in rows), "table.txt"))
    assert cells(table)["top_depth_m"] == ["1.5", "2.5"]


def test_the_delimiter_is_the_one_whose_headings_are_known_not_the_most_frequent(tmp_path: Path) -> None:
    text = "boring;top;description\nBH1;1;clay, gray, soft, wet, silty\nBH2;2;sand, gray, fine, wet, loose\n"
    assert cells(read(text_file(tmp_path, text)))["top_depth_m"] == ["1", "2"]


def test_a_first_line_that_states_the_delimiter_is_obeyed(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "sep=;\nboring;top\nBH1;1\n"))
    assert table.cells.index.tolist() == [3]


def test_a_delimiter_may_be_named(tmp_path: Path) -> None:
    path = text_file(tmp_path, "boring top LL\nBH1 1 20\n", "table.txt")
    assert cells(read(path, delimiter="space"))["liquid_limit_pct"] == ["20"]
    assert cells(read(text_file(tmp_path, "boring:top\nB:2\n"), delimiter=":"))["top_depth_m"] == ["2"]
    with pytest.raises(UsageError, match="one character"):
        read(path, delimiter="blank")


def test_a_quoted_cell_may_hold_delimiters_quotes_and_line_ends(tmp_path: Path) -> None:
    text = 'boring,top,description\nBH1,1,"clay, ""fat""\nwith roots"\nBH2,2,sand\n'
    table = read(text_file(tmp_path, text))
    assert cells(table)["description"] == ['clay, "fat"\nwith roots', "sand"]
    assert table.cells.index.tolist() == [2, 3]  # records, as a spreadsheet counts


def test_an_inch_mark_inside_a_cell_is_no_quote(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, 'boring,top,3/4",description\nBH1,1,95,2" gravel\n'))
    assert cells(table)["passing_19_mm_pct"] == ["95"]
    assert cells(table)["description"] == ['2" gravel']


@pytest.mark.parametrize("cell", ['"clay', '"clay" gray'])
def test_a_quote_out_of_place_is_refused_with_its_row(tmp_path: Path, cell: str) -> None:
    with pytest.raises(InputError, match=r"table.csv, row 3: found 'a quote out of place'"):
        read(text_file(tmp_path, f"boring,top,description\nBH1,1,sand\nBH2,2,{cell}\nBH3,3,silt\n"))


def test_a_row_with_a_delimiter_too_many_is_refused_with_its_number(tmp_path: Path) -> None:
    with pytest.raises(InputError, match=r"found 'up to 4 cells in row 3'; allowed: at most 3"):
        read(text_file(tmp_path, "boring,description,top\nBH1,sand,1\nBH2,clay, gray,2\nBH3,silt,3,,\n"))


@pytest.mark.parametrize("delimiter", [";", "\t"])
def test_decimal_commas_become_points_and_the_original_is_kept(tmp_path: Path, delimiter: str) -> None:
    rows = [
        ["boring", "top", "description", "LL", "cbr"],
        ["1,2", "0,5", "weich, 2,5", "35", "<2,5"],
        ["B2", "1", "hart", "40,25", ""],
    ]
    table = read(text_file(tmp_path, "\n".join(delimiter.join(row) for row in rows), "table.txt"))
    assert cells(table) == {
        "boring": ["1,2", "B2"],  # a name, not a number
        "top_depth_m": ["0.5", "1"],
        "description": ["weich, 2,5", "hart"],
        "liquid_limit_pct": ["35", "40.25"],
        "cbr_pct": ["<2.5", None],
    }
    assert table.original["top"].tolist() == ["0,5", "1"]
    assert checks(table) == {"decimal comma": "convert"}


def test_decimal_commas_in_chainages_become_points(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "station;level\n12+345,6;10,5\n"), "levels")
    assert cells(table) == {"chainage": ["12+345.6"], "level_m": ["10.5"]}


@pytest.mark.parametrize(
    "numbers",
    [
        ["1,5", "2.5"],  # both signs
        ["1,250", "2,500"],  # may be thousands
        ["1,250,000", "2,5"],  # are thousands somewhere
    ],
)
def test_commas_that_leave_doubt_are_not_changed(tmp_path: Path, numbers: list[str]) -> None:
    table = read(text_file(tmp_path, "boring;top;resistivity\n" + "".join(f"B;1;{n}\n" for n in numbers)))
    assert cells(table)["resistivity_ohm_cm"] == numbers
    assert checks(table) == {"unclear comma": "query"}


@pytest.mark.parametrize("text", ['boring,top,LL\nB,1,"2,5"\n', "boring|top|LL\nB|1|2,5\n"])
def test_commas_beside_other_delimiters_are_not_changed(tmp_path: Path, text: str) -> None:
    assert cells(read(text_file(tmp_path, text)))["liquid_limit_pct"] == ["2,5"]


@pytest.mark.parametrize("heading", ["sieve", "size (mm)"])
def test_sieves_by_name_become_sizes_in_mm(tmp_path: Path, heading: str) -> None:
    text = f"boring,sample,{heading},% passing\n" + "".join(
        f"B,S,{size},50\n" for size in ("3/4 in", "3/8", "No. 4", "#200", "0.002", "pan")
    )
    table = read(text_file(tmp_path, text), "gradations")
    assert cells(table)["size_mm"] == ["19", "9.5", "4.75", "0.075", "0.002", "pan"]
    assert table.headings["size_mm"].factor == 1.0
    assert table.findings["action"].unique().tolist() == ["convert"]
    assert table.findings["found"].tolist()[2:] == ["No. 4: 4.75 mm", "#200: 0.075 mm"]
    assert table.findings["row_number"].tolist() == [2, 3, 4, 5]


def test_inches_become_the_nominal_sizes_of_their_sieves(tmp_path: Path) -> None:
    text = "boring,sample,sieve (in),% passing\nB,S,3,100\nB,S,0.75,80\nB,S,1-1/2,90\nB,S,No. 200,5\n"
    table = read(text_file(tmp_path, text), "gradations")
    assert cells(table)["size_mm"] == ["75", "19", "37.5", "0.075"]
    assert table.headings["size_mm"].factor == 1.0


def test_plain_sizes_in_micrometers_are_left_to_the_factor(tmp_path: Path) -> None:
    table = read(text_file(tmp_path, "boring,sample,size (um),% passing\nB,S,75,5\n"), "gradations")
    assert (cells(table)["size_mm"], table.headings["size_mm"].factor) == (["75"], 0.001)
    assert not len(table.findings)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", "an empty file"),
        (b" \n,,\n", "no filled cell"),
        (b"boring,top\nB\x00,1\n", "a byte 0x00 at 12"),
        ("boring,top\nB,1\n".encode("utf-16-le"), "a byte 0x00"),
        (b"PK\x03\x04zzzz", r"a zip archive \(an XLSX workbook is one\)"),
        (b"\xd0\xcf\x11\xe0\xa1\xb1", "an old XLS workbook"),
        (b"%PDF-1.7\n", "a PDF document"),
        (b"\x89PNG\r\n\x1a\n\x00\x00", "a byte"),
        (b"\xff\xfea", "bytes that are not UTF-16"),
        (b"\xff\xfe\x00\x00\x00\x00\x00\x00", "null characters"),
    ],
)
def test_a_file_that_is_no_text_table_is_refused(tmp_path: Path, content: bytes, message: str) -> None:
    path = tmp_path / "lab.csv"
    path.write_bytes(content)
    with pytest.raises(InputError, match=rf"lab.csv.*{message}"):
        read(path)


def test_a_missing_file_is_refused_with_the_nearest_name(tmp_path: Path) -> None:
    text_file(tmp_path, TEXT, "samples.csv")
    with pytest.raises(InputError, match=r"no such file.*did you mean samples.csv\?"):
        read(tmp_path / "sample.csv")
    with pytest.raises(InputError, match="the folder nowhere is not there either"):
        read(tmp_path / "nowhere" / "sample.csv")


def test_a_folder_is_refused(tmp_path: Path) -> None:
    (tmp_path / "lab.csv").mkdir()
    with pytest.raises(InputError, match="found 'a folder'"):
        read(tmp_path / "lab.csv")


def test_a_file_that_may_not_be_read_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = text_file(tmp_path, TEXT)

    def refuse(*_: object, **__: object) -> None:
        raise PermissionError(13, "Permission denied")

    monkeypatch.setattr(Path, "open", refuse)
    with pytest.raises(InputError, match="may not be read"):
        read(path)


def test_a_file_beyond_all_measure_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(files, "MAX_FILE_BYTES", 20)
    with pytest.raises(InputError, match="split the file"):
        read(text_file(tmp_path, TEXT))


def test_a_table_beyond_all_width_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="found '10001 columns'; allowed: at most 10000"):
        read(text_file(tmp_path, "boring,top" + ",x" * 9999 + "\nB,1\n"))


def test_a_cell_beyond_all_length_is_refused(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="row 2"):
        read(text_file(tmp_path, "boring,top\nB," + "1" * 200_000 + "\n"))


def test_a_mark_of_old_systems_at_the_end_is_no_row(tmp_path: Path) -> None:
    assert len(read(text_file(tmp_path, "boring,top\nB,1\n\x1a")).cells) == 1
