"""The README and the program say the same."""

from __future__ import annotations

import re
from pathlib import Path

import pytest

import geomap
from geomap import catalog, cli
from geomap.ground import neighbors

ROOT = Path(geomap.__file__).parents[1]
README = (ROOT / "README.md").read_text("utf-8") if (ROOT / "README.md").exists() else ""
pytestmark = pytest.mark.skipif(not README, reason="an installed geomap has no README beside it")


def test_every_command_is_in_the_readme() -> None:
    assert {f"`geomap {name}" for name in cli.geomap.commands} == set(re.findall(r"`geomap [a-z]+(?=[ `])", README))


def test_every_standard_and_rule_set_is_in_the_readme() -> None:
    known = catalog.known()
    named = [entry["name"] for family in ("standards", "rule_sets") for entry in known[family]]
    assert all(f"`{name}`" in README for name in named)


def test_every_public_name_loads() -> None:
    assert len(geomap.__all__) <= 13
    for name in geomap.__all__:
        assert getattr(geomap, name) is not None


def test_the_ranges_in_the_readme_are_those_of_the_program() -> None:
    assert f"{neighbors.HORIZONTAL_RANGE_M:.0f} m along the line and {neighbors.VERTICAL_RANGE_M:.0f} m in" in README


def test_the_readme_opens_with_the_job_in_one_paragraph() -> None:
    first = README.split("\n\n")[1]
    assert first.startswith("An engineer on a road or pipeline corridor")
