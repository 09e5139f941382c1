"""The commands as a user meets them: what they print, where, and with which exit code."""

from __future__ import annotations

import json
import os
import sqlite3
import subprocess
import sys
import zipfile
from pathlib import Path

import openpyxl
import pandas as pd
import pytest

from geomap import cli
from tests.corridor import small

HEAVY = ("numpy", "pandas", "scipy", "geopandas", "pyogrio", "shapely", "pyproj", "folium", "pydantic", "openpyxl")


@pytest.fixture
def corridor(tmp_path: Path) -> Path:
    return small.write(tmp_path / "job")


def run(*arguments: object) -> int:
    return cli.run_command([str(a) for a in arguments])


def test_help_loads_none_of_the_heavy_libraries() -> None:
    code = (
        "import sys\nfrom geomap.cli import run_command\n"
        "for words in (['--help'], ['run', '--help'], ['--version']):\n    assert run_command(words) == 0\n"
        f"print([m for m in {HEAVY!r} if m in sys.modules], file=sys.stderr)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stderr.strip() == "[]"


def test_every_command_has_help_with_an_example(capsys: pytest.CaptureFixture[str]) -> None:
    for name in cli.geomap.commands:
        assert run(name, "--help") == 0
        out = capsys.readouterr().out
        assert "Example:  geomap" in out
        assert {"--quiet", "--json"} <= set(out.split())


def test_run_prints_counts_findings_answer_and_files(corridor: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("run", corridor) == 0
    seen = capsys.readouterr()
    assert "borings            4       3         1" in seen.out
    assert "found 'x 500300, y 5000080; 80 m from the line'" in seen.out
    assert "small_line.gpkg" in seen.out
    assert "Preliminary" in seen.out
    assert seen.err == ""  # no terminal, no progress


def test_json_is_one_object_on_standard_output(corridor: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("run", corridor, "--json") == 0
    answer = json.loads(capsys.readouterr().out)
    assert answer["ok"] is True
    assert answer["length_m"] == 600.0
    assert all(Path(f).is_file() for f in answer["files"])
    assert run("check", corridor, "--json") == 0
    answer = json.loads(capsys.readouterr().out)
    assert {row["table"]: row["left_out"] for row in answer["counts"]}["borings"] == 1
    assert run("list", "--json") == 0
    assert {s["name"] for s in json.loads(capsys.readouterr().out)["standards"]} >= {"astm_d2487", "aashto_m145"}


def test_quiet_prints_nothing(corridor: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("run", corridor, "--quiet") == 0
    assert run("check", corridor, "--quiet") == 0
    assert capsys.readouterr() == ("", "")


def test_wrong_usage_is_2_and_names_the_nearest_command(capsys: pytest.CaptureFixture[str]) -> None:
    assert run("chekc") == 2
    assert "check" in capsys.readouterr().err
    assert run("run") == 2
    assert run("run", "nowhere") == 2
    assert "geomap new" in capsys.readouterr().err


def test_an_error_in_json_mode_is_json_too(capsys: pytest.CaptureFixture[str]) -> None:
    assert run("run", "nowhere", "--json") == 2
    answer = json.loads(capsys.readouterr().out)
    assert (answer["ok"], answer["exit_code"]) == (False, 2)


def test_blocking_input_is_1_for_check_and_run(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    head, rows = small.TABLES["borings.csv"]
    far = {**small.TABLES, "borings.csv": (head, [(n, x + 2e5, *rest) for n, x, *rest in rows])}
    folder = small.write(tmp_path, tables=far)
    assert run("check", folder) == 1
    assert "done: block" in capsys.readouterr().out
    assert run("run", folder) == 1
    assert "crs" in capsys.readouterr().err
    assert not (folder / "out").exists()


def test_an_output_in_use_is_4_and_the_old_one_stays(corridor: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("run", corridor, "--quiet") == 0
    package = corridor / "out" / "small_line.gpkg"
    before = package.read_bytes()
    held = sqlite3.connect(package, isolation_level=None)
    held.execute("begin exclusive")
    try:
        assert run("run", corridor) == 4
    finally:
        held.rollback()
        held.close()
    assert "small_line.gpkg" in capsys.readouterr().err
    assert package.read_bytes() == before


def test_interrupted_is_130(corridor: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupt(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("geomap.pipeline.check", interrupt)
    assert run("run", corridor) == 130
    assert not (corridor / "out").exists()


def test_no_color_is_obeyed(corridor: Path) -> None:
    colored = subprocess.run(
        [sys.executable, "-m", "geomap", "check", str(corridor)],
        capture_output=True, text=True, check=True, env={**os.environ, "NO_COLOR": "1"},
    )  # fmt: skip
    assert "\x1b" not in colored.stdout + colored.stderr


def test_findings_can_be_saved(corridor: Path, tmp_path: Path) -> None:
    for name in ("findings.csv", "findings.xlsx"):
        assert run("check", corridor, "--to", tmp_path / name) == 0
    text = pd.read_csv(tmp_path / "findings.csv", encoding="utf-8-sig")
    book = pd.read_excel(tmp_path / "findings.xlsx")
    assert len(text) == len(book) > 0
    assert {"file", "row_number", "heading", "found", "allowed", "action", "severity"} <= set(text.columns)
    assert run("check", corridor, "--to", tmp_path / "findings.doc") == 2


def test_new_makes_a_corridor_that_check_can_talk_about(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("new", tmp_path / "road") == 0
    names = {p.name for p in (tmp_path / "road").iterdir()}
    assert {"corridor.toml", "alignment.csv", "borings.csv", "samples.csv"} <= names
    assert run("check", tmp_path / "road") == 1  # the tables are empty still
    assert "alignment.csv" in capsys.readouterr().err
    assert run("new", tmp_path / "road") == 2  # never over something


LAB = "Sample ref;No. 4;#10;No. 40;No. 200;LL;PL\n a ;100;97;80;61;45;25\nb;30;25;20;12;;\nb;100;99;95;88;NP;\n"


@pytest.mark.parametrize("ending", ["csv", "xlsx", "parquet", "gpkg"])
def test_classify_keeps_rows_order_and_columns_and_adds_classes(ending: str, tmp_path: Path) -> None:
    (tmp_path / "lab.csv").write_text(LAB, encoding="utf-8")
    target = tmp_path / f"classes.{ending}"
    assert run("classify", tmp_path / "lab.csv", "--to", target) == 0
    if ending == "gpkg":
        import pyogrio

        table = pyogrio.read_dataframe(target, read_geometry=False)
    else:
        table = {"csv": pd.read_csv, "xlsx": pd.read_excel, "parquet": pd.read_parquet}[ending](target)
    assert table["Sample ref"].str.strip().tolist() == ["a", "b", "b"]
    assert table["uscs_name"].fillna("").tolist() == ["sandy lean clay", "", "silt"]
    assert table["aashto_group"].fillna("").tolist()[::2] == ["A-7-6", "A-4"]
    assert set(table["uscs_symbol_candidates"].fillna("").tolist()[1].split(";")) <= {
        "GW-GM",
        "GP-GM",
        "GW-GC",
        "GP-GC",
    }
    assert [str(v) for v in table["LL"].fillna("")] == ["45", "", "NP"]


def test_classify_never_writes_over_the_table_and_refuses_what_it_cannot_write(tmp_path: Path) -> None:
    (tmp_path / "lab.csv").write_text(LAB, encoding="utf-8")
    assert run("classify", tmp_path / "lab.csv", "--to", tmp_path / "lab.csv") == 1
    assert (tmp_path / "lab.csv").read_text(encoding="utf-8") == LAB
    assert run("classify", tmp_path / "lab.csv", "--to", tmp_path / "lab.pdf") == 2
    assert run("classify", tmp_path / "lab.csv", "--to", tmp_path / "x.csv", "--system", "uscs") == 2
    assert run("classify", tmp_path / "none.csv", "--to", tmp_path / "x.csv") == 1


def xlsx_with(cells: list[list[object]], path: Path) -> None:
    book = openpyxl.Workbook()
    for row in cells:
        book.active.append(row)
    book.save(path)


BROKEN: dict[str, tuple[str, bytes | str]] = {
    "empty borings": ("borings.csv", ""),
    "headings only": ("borings.csv", "boring,x,y,depth_m\n"),
    "no depth heading": ("borings.csv", "boring,x,y\nA-1,500105,5000003\n"),
    "not text": ("borings.csv", bytes(range(256)) * 40),
    "a picture called csv": ("samples.csv", b"\x89PNG\r\n\x1a\n" + bytes(500)),
    "a workbook called csv": ("samples.csv", b"PK\x03\x04" + bytes(200)),
    "NUL bytes": ("samples.csv", "boring,top_depth_m\nA-1,\x000.5\n"),
    "utf-16 without mark": ("samples.csv", "boring,top_depth_m\nA-1,0.5\n".encode("utf-16-le")),
    "two headings for one column": ("samples.csv", "boring,top_depth_m,from\nA-1,0.5,0.5\n"),
    "prose": ("samples.csv", "Dear all,\nplease find attached.\n"),
    "words for coordinates": ("borings.csv", "boring,x,y,depth_m\nA-1,left,right,deep\n"),
    "infinite coordinates": ("borings.csv", "boring,x,y,depth_m\nA-1,inf,nan,1e400\n"),
    "one vertex": ("line.csv", "x,y\n500000,5000000\n"),
    "equal vertices": ("line.csv", "x,y\n500000,5000000\n500000,5000000\n"),
    "a vertex without y": ("line.csv", "x,y\n500000,5000000\n500600,\n"),
    "levels nowhere": ("ground.csv", "distance_m,level_m\n,\n,\n"),
    "levels in words": ("ground.csv", "distance_m,level_m\nstart,high\n"),
    "chainage off the line": ("formation.csv", "chainage,level_m\n9+000,20\n9+600,20\n"),
    "strata upside down": ("strata.csv", "boring,top_depth_m,base_depth_m\nA-1,3,1\nA-1,1,0\n"),
    "gradation of nobody": ("gradations.csv", "boring,sample,size_mm,passing_pct\nZ,S,4.75,100\n"),
    "a quote that never ends": ("samples.csv", 'boring,top_depth_m,description\nA-1,0.5,"clay\nA-2,1,x\n'),
    "very wide": ("samples.csv", "boring,top_depth_m," + ",".join(f"c{k}" for k in range(20_000)) + "\nA-1,1\n"),
}


@pytest.mark.parametrize("name", BROKEN)
def test_broken_input_gets_words_and_never_a_traceback(
    name: str, corridor: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    file, content = BROKEN[name]
    target = corridor / file
    target.write_bytes(content if isinstance(content, bytes) else content.encode("utf-8"))
    for command in ("check", "run"):
        code = run(command, corridor)
        seen = capsys.readouterr()
        assert code in (0, 1)
        assert "Traceback" not in seen.err
        assert "defect" not in seen.err
        assert file in seen.out + seen.err


@pytest.mark.parametrize("content", [b"", b"PK", b"PK\x03\x04broken", b"boring,top_depth_m\nA,1\n"])
def test_a_workbook_that_is_none_is_refused(content: bytes, corridor: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (corridor / "samples.xlsx").write_bytes(content)
    small.write(corridor, small.CORRIDOR.replace("samples.csv", "samples.xlsx"), {})
    assert run("check", corridor) == 1
    assert "samples.xlsx" in capsys.readouterr().err


def test_a_workbook_of_another_kind_is_refused(corridor: Path, capsys: pytest.CaptureFixture[str]) -> None:
    with zipfile.ZipFile(corridor / "samples.xlsx", "w") as book:
        book.writestr("word/document.xml", "<x/>")
    small.write(corridor, small.CORRIDOR.replace("samples.csv", "samples.xlsx"), {})
    assert run("check", corridor) == 1
    assert "samples.xlsx" in capsys.readouterr().err


def test_a_workbook_does_as_well_as_text(corridor: Path) -> None:
    head, rows = small.TABLES["samples.csv"]
    xlsx_with([["Results of the laboratory"], [], list(head), *[list(r) for r in rows]], corridor / "samples.xlsx")
    small.write(corridor, small.CORRIDOR.replace("samples.csv", "samples.xlsx"), {})
    assert run("run", corridor, "--quiet") == 0
