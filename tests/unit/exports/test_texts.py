"""Text of users is harmless as a file name, in a spreadsheet cell and in a database."""

from __future__ import annotations

import re

import pytest
from hypothesis import given
from hypothesis import strategies as st

from geomap.exports import texts

HOSTILE = (
    "{{7*7}}",
    "</script><script>alert(1)</script>",
    "=cmd|' /C calc'!A0",
    "B" * 300,
    "\u202egpj.exe\u202c بئر",
    "../../../etc/passwd",
    "C:\\windows\\system32",
    "'; DROP TABLE borings; --",
    "a\x00b\nc",
    "",
    "con",
)


@pytest.mark.parametrize("name", HOSTILE)
def test_a_hostile_name_gives_a_plain_file_name(name: str) -> None:
    assert re.fullmatch("[a-z0-9][a-z0-9_]{0,59}", texts.file_stem(name))


@given(st.text())
def test_any_name_gives_a_plain_file_name(name: str) -> None:
    assert re.fullmatch("[a-z0-9][a-z0-9_]{0,59}", texts.file_stem(name))


def test_names_in_other_scripts_and_long_names_do_not_fall_together() -> None:
    names = ["Дорога", "Железная дорога", "道路", "A" * 300, "A" * 301]
    assert len({texts.file_stem(name) for name in names}) == len(names)


@pytest.mark.parametrize(
    "text",
    [
        "=1+1",
        "+1+1",
        "-1+1",
        "@SUM(A1)",
        "\t=1",
        "\r=1",
        "\n=1",
        " =1+1",
        "\u00a0=1",
        "\uff1d1+1",
        "\u202e=1",
        "\x07=1",
    ],
)
def test_text_that_would_start_a_formula_gets_an_apostrophe(text: str) -> None:
    assert texts.spreadsheet_cell(text).startswith("'")


@pytest.mark.parametrize("text", ["-0.5", "+3", "1e-3", ".5", "12+345.6", "<2", "clay, firm", "a=b", ""])
def test_numbers_and_plain_text_stay(text: str) -> None:
    assert texts.spreadsheet_cell(text) == text


def test_marks_that_turn_the_writing_direction_are_dropped() -> None:
    assert texts.spreadsheet_cell("BH-\u202e1\u202c \u2066x\u2069\u200f") == "BH-1 x"


@given(st.text())
def test_no_cell_ever_starts_a_formula(text: str) -> None:
    cell = texts.spreadsheet_cell(text)
    assert not cell.lstrip().startswith(("=", "@"))
    assert re.fullmatch(r"[+-][\d.eE+-]+", cell) or not cell.lstrip().startswith(("+", "-"))


@given(st.text())
def test_stored_text_can_be_encoded(text: str) -> None:
    assert "\x00" not in texts.stored_text(text)
    texts.stored_text(text).encode("utf-8")


def test_half_a_character_is_replaced() -> None:
    assert texts.stored_text("a\ud800b") == "a\ufffdb"
