"""What `geomap classify` and `geomap check --to` leave on the disk: headings, names, permissions, and nothing else."""

from __future__ import annotations

import json
import os
import sqlite3
import stat
from pathlib import Path

import openpyxl
import pandas as pd
import pyogrio
import pytest

from geomap import cli
from geomap.errors import InputError, OutputInUseError
from geomap.exports import table_files
from tests.corridor import small

LAB = "{};No. 4;#10;No. 40;No. 200;LL;PL\nx;100;97;80;61;45;25\ny;100;99;95;88;NP;\n"  # constructed
ENDINGS = ["csv", "xlsx", "parquet", "gpkg"]


def run(*arguments: object) -> int:
    return cli.run_command([str(a) for a in arguments])


def lab(folder: Path, heading: str = "Sample ref") -> Path:
    """Write a table whose first columns have these headings, parted by semicolons, all filled alike."""
    first, *rest = LAB.splitlines()
    count = heading.count(";")
    rows = [first.format(heading), *(f"{row[0]};" * count + row for row in rest)]
    (folder / "lab.csv").write_text("\n".join(rows) + "\n", encoding="utf-8")
    return folder / "lab.csv"


def read(path: Path) -> pd.DataFrame:
    if path.suffix == ".gpkg":
        return pyogrio.read_dataframe(path, read_geometry=False)
    if path.suffix == ".csv":
        return pd.read_csv(path, encoding="utf-8-sig")
    return pd.read_excel(path) if path.suffix == ".xlsx" else pd.read_parquet(path)


def heading_row(path: Path) -> list[str]:
    """Return the headings as they stand in the file, before pandas tells equal ones apart."""
    if path.suffix == ".csv":
        return path.read_text("utf-8-sig").splitlines()[0].split(",")
    if path.suffix == ".xlsx":
        return [str(cell.value) for cell in openpyxl.load_workbook(path).active[1]]
    return list(read(path).columns)


@pytest.mark.parametrize(
    ("headings", "written"),
    [
        ("fid", ["fid_2"]),
        ("FID", ["FID_2"]),
        ("geom", ["geom_2"]),
        ("a;A", ["a", "A_2"]),
        ("a;A;a_2", ["a", "A_3", "a_2"]),
        ("fid;fid_2", ["fid_3", "fid_2"]),
    ],
)
def test_headings_that_a_geopackage_cannot_take_are_written_under_another_name_and_said(
    headings: str, written: list[str], tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    target = tmp_path / "classes.gpkg"
    assert run("classify", lab(tmp_path, headings), "--to", target, "--json") == 0
    table = read(target)
    assert list(table.columns[: len(written)]) == written
    assert all(table[name].tolist() == ["x", "y"] for name in written)
    assert table["uscs_name"].tolist() == ["sandy lean clay", "silt"]
    said = {
        (f["heading"], f["advice"], f["severity"])
        for f in json.loads(capsys.readouterr().out)["findings"]
        if f["topic"] == "heading renamed"
    }
    pairs = zip(headings.split(";"), written, strict=True)
    assert said == {(old, f"written as {new}", "note") for old, new in pairs if old != new}


@pytest.mark.parametrize("ending", ["csv", "xlsx", "parquet"])
def test_other_formats_keep_such_headings(ending: str, tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = tmp_path / f"classes.{ending}"
    assert run("classify", lab(tmp_path, "fid;a;A"), "--to", target) == 0
    assert heading_row(target)[:3] == ["fid", "a", "A"]
    assert "heading renamed" not in capsys.readouterr().out


@pytest.mark.parametrize("ending", ENDINGS)
def test_a_table_classified_again_and_again_has_no_two_columns_alike(ending: str, tmp_path: Path) -> None:
    source = lab(tmp_path)
    for turn in range(3):
        target = tmp_path / f"turn_{turn}.csv"
        assert run("classify", source, "--to", target, "--quiet") == 0
        source = target
    assert run("classify", source, "--to", tmp_path / f"last.{ending}", "--quiet") == 0
    headings = heading_row(tmp_path / f"last.{ending}")
    assert len({name.casefold() for name in headings}) == len(headings)
    ours = ["uscs_symbol", "uscs_symbol_geomap", "uscs_symbol_geomap_2", "uscs_symbol_geomap_3"]
    assert [name for name in headings if name in ours] == ours
    assert read(tmp_path / f"last.{ending}")[ours].nunique(axis=1).tolist() == [1, 1]


def test_our_column_gives_way_whatever_the_case(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("classify", lab(tmp_path, "USCS_Symbol"), "--to", tmp_path / "classes.gpkg", "--json") == 0
    answer = json.loads(capsys.readouterr().out)
    assert read(tmp_path / "classes.gpkg").columns[0] == "USCS_Symbol"
    assert {"uscs_symbol_geomap", "uscs_name"} <= set(read(tmp_path / "classes.gpkg").columns)
    assert answer["classified"] == {"astm_d2487": 2, "aashto_m145": 2}


def test_a_system_asked_for_twice_is_given_once(tmp_path: Path) -> None:
    twice = ("--system", "astm_d2487", "--system", "astm_d2487")
    assert run("classify", lab(tmp_path), "--to", tmp_path / "classes.csv", *twice, "--quiet") == 0
    assert heading_row(tmp_path / "classes.csv").count("uscs_symbol") == 1


@pytest.mark.skipif(os.name != "posix", reason="permissions of POSIX")
@pytest.mark.parametrize("ending", ENDINGS)
def test_permissions_are_those_of_any_new_file_or_of_the_old_one(ending: str, tmp_path: Path) -> None:
    target = tmp_path / f"classes.{ending}"
    before = os.umask(0o027)
    try:
        assert run("classify", lab(tmp_path), "--to", target, "--quiet") == 0
        assert stat.S_IMODE(target.stat().st_mode) == 0o640
        target.chmod(0o664)
        assert run("classify", lab(tmp_path), "--to", target, "--quiet") == 0
        assert stat.S_IMODE(target.stat().st_mode) == 0o664
    finally:
        os.umask(before)


@pytest.mark.parametrize("error", [ValueError("no"), KeyboardInterrupt(), MemoryError()])
def test_nothing_is_left_behind_and_the_old_file_stays_when_writing_fails(
    error: BaseException, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(_: pd.DataFrame, path: Path, **__: object) -> None:
        Path(path).write_text("half", encoding="utf-8")
        raise error

    (tmp_path / "old.csv").write_text("old", encoding="utf-8")
    monkeypatch.setattr(pd.DataFrame, "to_csv", fail)
    with pytest.raises(type(error)):
        table_files.save(pd.DataFrame({"a": ["1"]}), tmp_path / "old.csv", "samples")
    assert [p.name for p in tmp_path.iterdir()] == ["old.csv"]
    assert (tmp_path / "old.csv").read_text(encoding="utf-8") == "old"


@pytest.mark.parametrize("name", ["DataSourceError", "DataLayerError", "FeatureError"])
def test_what_gdal_cannot_write_is_an_output_in_use(
    name: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    def fail(*_: object, **__: object) -> None:
        raise getattr(pyogrio.errors, name)("disk full")

    source = lab(tmp_path)
    monkeypatch.setattr("pyogrio.write_dataframe", fail)
    assert run("classify", source, "--to", tmp_path / "classes.gpkg") == 4
    said = capsys.readouterr().err
    assert "classes.gpkg: found 'disk full'" in said
    assert "defect" not in said
    assert [p.name for p in tmp_path.iterdir()] == ["lab.csv"]


def test_more_columns_than_a_geopackage_holds_are_refused_in_words(tmp_path: Path) -> None:
    wide = pd.DataFrame({f"c{number}": ["x"] for number in range(2_500)})
    with pytest.raises(InputError, match="a table that a GeoPackage can hold"):
        table_files.save(wide, tmp_path / "wide.gpkg", "samples")
    assert not list(tmp_path.iterdir())


def test_a_geopackage_that_is_held_is_4_and_stays(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = tmp_path / "classes.gpkg"
    assert run("classify", lab(tmp_path), "--to", target, "--quiet") == 0
    before = target.read_bytes()
    held = sqlite3.connect(target, isolation_level=None)
    held.execute("begin exclusive")
    try:
        assert run("classify", lab(tmp_path), "--to", target) == 4
    finally:
        held.rollback()
        held.close()
    assert "classes.gpkg" in capsys.readouterr().err
    assert target.read_bytes() == before


def test_a_folder_that_is_not_there_or_a_folder_for_a_file_is_4(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (tmp_path / "classes.csv").mkdir()
    assert run("classify", lab(tmp_path), "--to", tmp_path / "none" / "classes.csv") == 4
    assert "a folder that exists" in capsys.readouterr().err
    assert run("classify", lab(tmp_path), "--to", tmp_path / "classes.csv") == 4
    assert "classes.csv" in capsys.readouterr().err
    assert {p.name for p in tmp_path.iterdir()} == {"classes.csv", "lab.csv"}


@pytest.mark.parametrize(
    ("table", "words"),
    [
        (pd.DataFrame({"a": range(table_files.MOST_XLSX_ROWS + 1)}), "found '1,048,576 rows'; allowed: at most 1,048,"),
        (pd.DataFrame([range(16_385)]), "found '16,385 columns'; allowed: at most 16,384 columns"),
        (pd.DataFrame({"a": ["x"], "note": ["x" * 32_768]}), "note: found 'a cell of 32,768 characters'"),
        (pd.DataFrame({"note": ["=" * 32_767]}), "32,768 characters"),  # with the mark that makes it text
        (pd.DataFrame({"note": ["\N{BRICK}" * 16_384]}), "32,768 characters"),  # two units of UTF-16 each
        (pd.DataFrame({"x" * 32_768: ["a"]}), "32,768 characters"),
    ],
    ids=["rows", "columns", "characters", "marked formula", "beyond the basic plane", "heading"],
)
def test_more_than_xlsx_holds_is_refused_in_words(table: pd.DataFrame, words: str, tmp_path: Path) -> None:
    with pytest.raises(InputError) as caught:
        table_files.save(table, tmp_path / "big.xlsx", "samples")
    assert words in str(caught.value)
    assert "choose CSV, Parquet or GeoPackage" in str(caught.value)
    assert not list(tmp_path.iterdir())


def test_a_cell_as_long_as_xlsx_holds_is_written_whole(tmp_path: Path) -> None:
    table_files.save(pd.DataFrame({"note": ["x" * 32_767]}), tmp_path / "long.xlsx", "samples")
    assert read(tmp_path / "long.xlsx")["note"].str.len().tolist() == [32_767]


@pytest.mark.parametrize("ending", ENDINGS)
def test_characters_that_a_format_cannot_hold_do_not_spoil_the_file(ending: str, tmp_path: Path) -> None:
    odd = [chr(code) for code in (*range(9), 11, 12, *range(14, 32), 0x7F, 0xD800, 0xFFFE, 0xFFFF)]
    table = pd.DataFrame({"no\ufffete\x00": [f"a{c}b" for c in odd]}, dtype=object)
    table_files.save(table, tmp_path / f"odd.{ending}", "samples")
    cells = read(tmp_path / f"odd.{ending}").iloc[:, 0]
    assert len(cells) == len(odd)
    assert all(cell.startswith("a") and cell.endswith("b") for cell in cells)


def test_headings_that_are_alike_or_blank_do_no_harm(tmp_path: Path) -> None:
    table = pd.DataFrame([["1", "=2", "3", ""]], columns=["a", "a", "", ""])
    for ending in ENDINGS:
        table_files.save(table, tmp_path / f"alike.{ending}", "samples")
    assert heading_row(tmp_path / "alike.csv") == ["a", "a", "", ""]
    for ending in ("gpkg", "parquet"):
        assert heading_row(tmp_path / f"alike.{ending}") == ["a", "a_2", "column", "column_2"]
        assert read(tmp_path / f"alike.{ending}").iloc[0].tolist()[:3] == ["1", "=2", "3"]


def test_the_layer_or_sheet_is_named_for_what_it_holds(tmp_path: Path) -> None:
    corridor = small.write(tmp_path / "job")
    for ending in ("gpkg", "xlsx"):
        assert run("check", corridor, "--to", tmp_path / f"f.{ending}", "--quiet") == 0
        assert run("classify", lab(tmp_path), "--to", tmp_path / f"c.{ending}", "--quiet") == 0
    for stem, name in (("f", "findings"), ("c", "samples")):
        assert pyogrio.list_layers(tmp_path / f"{stem}.gpkg")[:, 0].tolist() == [name]
        assert openpyxl.load_workbook(tmp_path / f"{stem}.xlsx").sheetnames == [name]


def test_a_folder_that_takes_no_file_is_an_output_in_use(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def refuse(*_: object, **__: object) -> str:
        raise PermissionError(13, "Permission denied", str(tmp_path))

    monkeypatch.setattr("tempfile.mkdtemp", refuse)
    with pytest.raises(OutputInUseError, match=r"Permission denied.*close it or name another"):
        table_files.save(pd.DataFrame({"a": ["1"]}), tmp_path / "x.csv", "samples")
