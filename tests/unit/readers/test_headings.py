"""Headings in the spellings that people use."""

from __future__ import annotations

import pytest

from geomap.readers.headings import Reading, UnknownUnit, reading, reading_as, spellings
from geomap.readers.spelling import key
from geomap.tables import schema

FOOT = 0.3048
PCF = 0.45359237 / 0.3048**3  # pound and foot of the 1959 agreement


def column_of(heading: str, layout: str = "samples") -> str | None:
    found = reading(heading, schema.inputs()[layout])
    return found.column if isinstance(found, Reading) else None


@pytest.mark.parametrize("layout", schema.inputs())
def test_no_spelling_means_two_columns_of_one_layout(layout: str) -> None:
    owner: dict[str, str] = {}
    for column, names in spellings(schema.inputs()[layout]).items():
        for name in names:
            assert owner.setdefault(key(name), column) == column, name


@pytest.mark.parametrize("layout", schema.inputs())
def test_every_name_and_alias_is_read_in_any_case_and_with_any_mark_between_words(layout: str) -> None:
    for column, names in spellings(schema.inputs()[layout]).items():
        for name in names:
            for written in (name, name.upper(), name.title(), *(name.replace(" ", mark) for mark in "._-")):
                assert column_of(written, layout) == column, written


@pytest.mark.parametrize("layout", schema.inputs())
def test_the_titles_that_geomap_writes_are_read_back(layout: str) -> None:
    for column in schema.inputs()[layout].columns:
        assert column_of(schema.column(column).title, layout) == column


@pytest.mark.parametrize(
    ("heading", "column", "factor"),
    [
        ("top_depth_m", "top_depth_m", 1.0),
        ("top_depth_ft", "top_depth_m", FOOT),
        ("Top Depth (ft)", "top_depth_m", FOOT),
        ("Top depth [m]", "top_depth_m", 1.0),
        ("Top depth, ft", "top_depth_m", FOOT),
        ("Depth / m", "top_depth_m", 1.0),
        ("DEPTH.FEET", "top_depth_m", FOOT),
        ("Depth from (cm)", "top_depth_m", 0.01),
        ("From (m bgl)", "top_depth_m", 1.0),
        ("To (US-ft)", "base_depth_m", 1200 / 3937),  # Mendenhall order of 1893
        ("LL (%)", "liquid_limit_pct", 1.0),
        ("LL%", "liquid_limit_pct", 1.0),
        ("LL, %", "liquid_limit_pct", 1.0),
        ("Liquid Limit (LL) (%)", "liquid_limit_pct", 1.0),
        ("MDD (pcf)", "max_dry_density_kg_m3", PCF),
        ("max_dry_density_kg_m3", "max_dry_density_kg_m3", 1.0),
        ("MDD (Mg/m³)", "max_dry_density_kg_m3", 1000.0),
        ("unconfined (ksf)", "unconfined_kpa", 47.88025898),  # 1000 lbf/ft2, from the exact pound, foot and gravity
        ("UCS (psi)", "unconfined_kpa", 6.894757293),  # likewise; NIST SP 811, appendix B.8, prints 6.894 757
        ("Sulphate (ppm)", "sulfate_mg_kg", 1.0),
        ("Resistivity, ohm-m", "resistivity_ohm_cm", 100.0),
        ("D10 (mm)", "d10_mm", 1.0),
        ("Moisture content, % dry mass", "moisture_pct", 1.0),
    ],
)
def test_the_unit_in_a_heading_gives_the_factor(heading: str, column: str, factor: float) -> None:
    found = reading(heading, schema.inputs()["samples"])
    assert isinstance(found, Reading)
    assert (found.column, found.factor) == (column, pytest.approx(factor, rel=1e-9))


@pytest.mark.parametrize("heading", ["LL", "Top depth", "Liquid limit (LL)", "Plasticity Index, PI", "CBR (soaked)"])
def test_a_heading_without_unit_says_so(heading: str) -> None:
    found = reading(heading, schema.inputs()["samples"])
    assert isinstance(found, Reading)
    assert found.factor is None


def test_levels_are_not_taken_for_depths() -> None:
    assert reading("Top (m AOD)", schema.inputs()["samples"]) == UnknownUnit("top_depth_m", "m aod")
    assert column_of("Ground level (m AOD)", "borings") == "ground_level_m"


@pytest.mark.parametrize("heading", ["Top depth (yd)", "LL (kPa)", "MDD (furlongs)"])
def test_a_unit_that_a_column_cannot_have_is_not_passed_over(heading: str) -> None:
    assert isinstance(reading(heading, schema.inputs()["samples"]), UnknownUnit)


def test_an_alias_counts_only_where_the_layout_has_its_column() -> None:
    assert column_of("level", "borings") == "ground_level_m"
    assert column_of("level", "levels") == "level_m"
    assert column_of("level", "samples") is None
    assert column_of("depth", "borings") == "depth_m"
    assert column_of("depth", "samples") == "top_depth_m"


def test_coordinates_and_chainages_keep_note_of_a_unit_without_a_factor() -> None:
    assert reading("Easting (US-ft)", schema.inputs()["borings"]) == Reading("x", "us-ft", 1.0)
    assert reading("Station (ft)", schema.inputs()["levels"]) == Reading("chainage", "ft", 1.0)


def test_sieves_count_only_in_a_layout_that_takes_them() -> None:
    assert column_of("P200", "samples") == "passing_0_075_mm_pct"
    assert column_of("P200", "borings") is None


def test_the_users_own_heading_may_state_a_unit() -> None:
    depth = schema.column("depth_m")
    assert reading_as("Teufe (ft)", depth) == Reading("depth_m", "ft", 0.3048)
    assert reading_as("Teufe", depth) == Reading("depth_m")


@pytest.mark.parametrize("cell", ["", "   ", "Sandy clay with much text " * 9, "12.5"])
def test_cells_that_are_no_headings_mean_nothing(cell: str) -> None:
    assert reading(cell, schema.inputs()["samples"]) is None
