"""Classes of tables: shape, order, types, and the two ways in."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from geomap.errors import UsageError
from geomap.soils.classification import classify, classify_samples
from geomap.soils.properties import properties
from geomap.soils.sieve_table import table_from_wide
from geomap.soils.systems import SYSTEMS, System
from geomap.tables import schema
from tests.unit.soils.samples import samples_from

ALL = tuple(system.NAME for system in SYSTEMS)
SAMPLES = samples_from(
    [
        {"p4": 100, "p10": 95, "p40": 80, "p200": 60, "p50": 50, "p002": 20, "ll": 40, "pl": 20},
        {"p4": 90, "p10": 80, "p40": 40, "p200": 3, "cu": 5, "cc": 1, "np": 1},
        {"p4": 90, "p200": 8},
        {"visual": "CH"},
        {"visual": "PT"},
        {},
    ]
).set_index(pd.Index(["a", "f", "b", "e", "c", "d"]))


@pytest.mark.parametrize("system", SYSTEMS, ids=ALL)
def test_a_system_says_what_it_is(system: System) -> None:
    assert system.COLUMN in schema.columns()
    assert set(system.SYMBOL_NAMES) == set(system.SYMBOLS)
    assert all(system.SYMBOL_NAMES.values())
    assert len(set(system.SYMBOLS)) == len(system.SYMBOLS) < 127
    assert system.TITLE
    assert system.SOURCE
    assert system.EDITION


@pytest.mark.parametrize("system", SYSTEMS, ids=ALL)
def test_codes_and_classify_agree(system: System) -> None:
    records = properties(SAMPLES, table_from_wide(SAMPLES))
    arrays = {name: records[name].to_numpy() for name in system.NEEDS if name in records}
    codes = system.codes(arrays)
    assert codes.dtype == np.int8
    symbols = system.classify(records)[system.COLUMN]
    assert [system.SYMBOLS[code - 1] if code else None for code in codes] == symbols.astype(object).where(
        symbols.notna(), None
    ).tolist()


@pytest.mark.parametrize("system", SYSTEMS, ids=ALL)
def test_no_records_have_no_codes(system: System) -> None:
    assert len(system.codes({name: np.zeros(0) for name in system.NEEDS})) == 0
    assert len(system.codes({})) == 0


def test_rows_columns_and_types_are_those_of_the_vocabulary() -> None:
    found = classify_samples(SAMPLES, ALL)
    assert found.index.tolist() == SAMPLES.index.tolist()
    for name in found:
        column = schema.columns()[name]
        found[name].astype(column.dtype)
        if column.choices:
            assert set(found[name].dropna()) <= set(column.choices)
        if column.type == "flag":
            assert found[name].dtype == "boolean"
    assert found["group_index"].dtype == "Int64"
    assert found["uscs_symbol"].astype(object).fillna("").tolist() == ["CL", "SP", "", "CH", "PT", ""]
    assert found["uscs_symbol_basis"].astype(object).fillna("").tolist() == ["lab", "lab", "", "visual", "visual", ""]
    assert found["aashto_group"].astype(object).fillna("").tolist() == ["A-6", "A-1-b", "", "", "A-8", ""]
    assert found["usda_texture"].astype(object).fillna("").tolist() == ["loam", "sand", "", "", "", ""]


def test_reasons_can_be_left_out() -> None:
    found, short = classify_samples(SAMPLES, ALL), classify_samples(SAMPLES, ALL, with_reasons=False)
    assert [name for name in found if name not in short] == [
        f"{column}_{kind}"
        for column in ("uscs_symbol", "aashto_group", "usda_texture")
        for kind in ("reason", "candidates")
    ]
    pd.testing.assert_frame_equal(short, found[short.columns])


def test_curves_in_long_form_give_what_the_columns_give() -> None:
    names = schema.passing_columns(SAMPLES.columns)
    long = SAMPLES[names].melt(ignore_index=False, value_name="passing_pct").dropna()
    long["size_mm"] = long["variable"].map(schema.size_from_passing_column)
    long = long.reset_index(names="sample_row")[["sample_row", "size_mm", "passing_pct"]]
    found = classify_samples(SAMPLES.drop(columns=names), ALL, gradations=long)
    pd.testing.assert_frame_equal(found, classify_samples(SAMPLES, ALL))


def test_each_row_of_samples_in_memory_stands_alone() -> None:
    rows = samples_from([{"p4": 100, "p200": 60}, {"ll": 40, "pl": 20}]).assign(boring="B1", top_depth_m=1.0)
    assert classify_samples(rows)["uscs_symbol"].isna().all()


def test_inputs_stay_as_they_are() -> None:
    before = SAMPLES.copy()
    classify_samples(SAMPLES, ALL)
    pd.testing.assert_frame_equal(SAMPLES, before)


def test_nullable_columns_are_read_like_plain_ones() -> None:
    nullable = SAMPLES.convert_dtypes()
    pd.testing.assert_frame_equal(classify_samples(nullable, ALL), classify_samples(SAMPLES, ALL))


def test_the_organic_limit_of_the_project_makes_peat() -> None:
    sample = samples_from([{"p4": 100, "p200": 90, "ll": 60, "pl": 30, "organic": 12}])
    assert classify_samples(sample)["uscs_symbol"].tolist() == ["CH"]
    found = classify_samples(sample, organic_limit_pct=10.0).iloc[0]
    assert (found["uscs_symbol"], found["uscs_name"], found["aashto_group"]) == ("PT", "peat", "A-8")
    assert (found["uscs_symbol_basis"], found["aashto_group_basis"]) == ("visual", "visual")
    assert pd.isna(found["group_index"])


def test_an_unknown_system_is_an_error_that_lists_the_known_ones() -> None:
    with pytest.raises(UsageError, match="astm_d2487, aashto_m145, usda_texture"):
        classify(pd.DataFrame(), ["astm_d2488"])
