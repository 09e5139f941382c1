"""The corridor file: what it accepts, and what it says when it does not."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from geomap.corridor import Corridor, read_corridor
from geomap.corridor_text import template
from geomap.errors import UsageError

CHOICES = {
    "systems": ["astm_d2487", "aashto_m145", "usda_texture"],
    "rules": ["general_subgrade"],
    "products": ["geopackage", "web_map", "schedules"],
}
GOOD = """\
[corridor]
name = "Test line"
crs = "EPSG:32633"
[alignment]
file = "line.csv"
[borings]
file = "borings.csv"
[samples]
file = "samples.csv"
"""


def corridor_in(folder: Path, text: str) -> Corridor:
    for name in ("line.csv", "borings.csv", "samples.csv"):
        (folder / name).write_text("x")
    (folder / "corridor.toml").write_text(text, encoding="utf-8")
    return read_corridor(folder, CHOICES)


def refusal(folder: Path, text: str) -> str:
    with pytest.raises(UsageError) as caught:
        corridor_in(folder, text)
    return str(caught.value)


def test_defaults_fill_what_is_not_said(tmp_path: Path) -> None:
    corridor = corridor_in(tmp_path, GOOD)
    assert corridor.corridor.half_width_m == 75
    assert corridor.subgrade.rules == ["general_subgrade"]
    assert corridor.profile.systems == ["astm_d2487", "aashto_m145"]
    assert corridor.formation is None
    assert [f.name for f in corridor.files()] == ["corridor.toml", "line.csv", "borings.csv", "samples.csv"]


def test_a_folder_or_the_file_itself_may_be_named(tmp_path: Path) -> None:
    corridor = corridor_in(tmp_path, GOOD)
    assert read_corridor(tmp_path / "corridor.toml", CHOICES) == corridor


@pytest.mark.parametrize(
    ("changed", "to", "line", "words"),
    [
        ("crs =", "crz =", 3, "did you mean crs?"),
        ('crs = "EPSG:32633"', 'crs = "EPSG:32633"\nhalf_width = 50', 4, "did you mean half_width_m?"),
        ("[samples]", "[sampels]", 8, "did you mean samples?"),
        ('name = "Test line"', "name = 3", 2, "[corridor] name: found '3'"),
        ('name = "Test line"', 'name = ""', 2, "at least 1 character"),
        ('file = "samples.csv"', 'file = "sample.csv"', 9, "a file that exists"),
        ('file = "samples.csv"', 'file = "../samples.csv"', 9, "inside the folder"),
        ('file = "samples.csv"', "file = 3", 9, "a file name or a list of them"),
        ('file = "samples.csv"', 'file = "samples.csv"\n[profile]\nstep_m = -1', 11, "greater than 0"),
        (
            'file = "samples.csv"',
            'file = "samples.csv"\n[profile]\nsystems = ["astm_d2478"]',
            11,
            "did you mean astm_d2487?",
        ),
        ('file = "samples.csv"', 'file = "samples.csv"\n[subgrade]\nrules = ["x.toml"]', 11, "general_subgrade"),
        ('file = "samples.csv"', 'file = "samples.csv"\n[outputs]\nproducts = ["pdf"]', 11, "geopackage"),
        (
            'file = "samples.csv"',
            'file = "samples.csv"\n[samples.columns]\nliquid_limt_pct = "a"',
            11,
            "liquid_limit_pct?",
        ),
        ('file = "samples.csv"', 'file = "samples.csv"\n[formation]\nfile = "line.csv"', 10, "add `reference`"),
    ],
)
def test_what_is_wrong_is_named_with_its_line(tmp_path: Path, changed: str, to: str, line: int, words: str) -> None:
    text = GOOD.replace(changed, to)
    assert text != GOOD
    message = refusal(tmp_path, text)
    assert any(part.startswith(f"corridor.toml:{line}:") and words in part for part in message.splitlines()), message


def test_all_problems_are_told_at_once(tmp_path: Path) -> None:
    text = GOOD.replace("crs =", "crz =").replace('name = "Test line"', "name = 3")
    message = refusal(tmp_path, text)
    assert len(message.splitlines()) == 3  # crz is unknown, crs is missing, name is a number


def test_broken_toml_names_the_line(tmp_path: Path) -> None:
    assert "line 2" in refusal(tmp_path, GOOD.replace('name = "Test line"', "name = ="))


def test_a_missing_file_says_what_to_do(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="geomap new"):
        read_corridor(tmp_path / "nowhere", CHOICES)


def test_a_file_that_is_not_text_is_refused(tmp_path: Path) -> None:
    (tmp_path / "corridor.toml").write_bytes(b"\xff\xfe\x00\x01")
    with pytest.raises(UsageError, match="UTF-8"):
        read_corridor(tmp_path, CHOICES)


def test_the_template_names_every_key_and_is_a_corridor_file(tmp_path: Path) -> None:
    text = template(Corridor)
    for section, field in Corridor.model_fields.items():
        if section != "path":
            assert f"[{section}]" in text
            assert field.description
            assert field.description in text
    parsed = tomllib.loads(
        "\n".join(line.removeprefix("# ") for line in text.splitlines() if "=" in line or "[" in line)
    )
    assert set(parsed) == set(Corridor.model_fields) - {"path"}
    assert corridor_in(tmp_path, text.replace("alignment.csv", "line.csv")).corridor.name == "New corridor"
