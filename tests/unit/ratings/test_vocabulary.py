"""The words of rule sets follow the tables."""

from __future__ import annotations

import pytest

from geomap.ratings import vocabulary
from geomap.soils import properties
from geomap.soils.systems import SYSTEMS
from geomap.tables import schema


def test_the_sieves_of_rules_are_those_that_every_record_has() -> None:
    assert vocabulary.SIEVES_MM == properties.NAMED_MM


def test_classes_of_every_system_can_be_asked_for() -> None:
    assert {system.COLUMN for system in SYSTEMS} <= set(vocabulary.soil_columns())


@pytest.mark.parametrize("name", ["file", "sheet", "row_number", "status", "boring", "distance_m", "rule", "level_m"])
def test_places_and_sources_are_not_soil(name: str) -> None:
    assert schema.column(name).name == name
    assert name not in vocabulary.soil_columns()


def test_what_is_left_out_is_a_column_of_the_samples_in_the_first_place() -> None:
    samples = {*schema.inputs()["samples"].columns, *schema.layers()["samples"].columns}
    assert vocabulary._NOT_SOIL - samples == {"geometry"}
    assert set(schema.columns()) & set(vocabulary.soil_columns()) | vocabulary._NOT_SOIL >= samples


NEAREST = [
    ("fines", "fines_pct"),
    ("Liquid_Limit", "liquid_limit_pct"),
    ("LL", "liquid_limit_pct"),
    ("loss on ignition", "organic_pct"),
    ("uscs_simbol", "uscs_symbol"),
    ("passing_0_075_pct", "passing_0_075_mm_pct"),
    ("qwertz", None),
]


@pytest.mark.parametrize(("word", "column"), NEAREST)
def test_a_wrong_column_is_answered_with_the_one_meant(word: str, column: str | None) -> None:
    assert vocabulary.nearest_column(word) == column
