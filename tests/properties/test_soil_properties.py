"""Laws of classification that hold for any valid gradation and limits."""

from __future__ import annotations

from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import assume, given, settings
from hypothesis import strategies as st

from geomap.soils.classification import classify, classify_samples
from geomap.soils.properties import describe
from geomap.soils.specimens import TOLERANCE_M, join
from geomap.soils.systems import SYSTEMS
from geomap.tables.schema import passing_column, size_from_passing_column

SIZES = (75.0, 19.0, 4.75, 2.0, 0.425, 0.15, 0.075, 0.05, 0.002)
PASSING = [passing_column(size) for size in SIZES]
MANY = settings(max_examples=40, deadline=None)


def percents(draw: st.DrawFn, digits: int, count: int) -> list[float]:
    scale = 10**digits
    edges = st.sampled_from([0, 4, 5, 8, 10, 12, 13, 15, 25, 30, 35, 36, 49, 50, 51, 70, 85, 100]).map(
        lambda p: p * scale
    )
    one = st.one_of(edges, st.integers(0, 100 * scale))
    return sorted((value / scale for value in draw(st.lists(one, min_size=count, max_size=count))), reverse=True)


@st.composite
def samples(draw: st.DrawFn, gaps: bool = True, oversize: bool = True) -> dict[str, Any]:
    """Return the cells of one sample: a falling curve, limits that fit, some of them missing."""
    digits = draw(st.integers(0, 1))
    cells: dict[str, Any] = dict(zip(PASSING, percents(draw, digits, len(SIZES)), strict=True))
    if not oversize:
        cells[PASSING[0]] = 100.0
    ll = draw(st.integers(0, 120 * 10**digits)) / 10**digits
    cells["liquid_limit_pct"] = ll
    cells["plastic_limit_pct"] = round(ll * draw(st.floats(0.2, 1.0)), digits)
    cells["is_nonplastic"] = draw(st.booleans()) and draw(st.booleans())
    if draw(st.booleans()):
        cells["liquid_limit_oven_dried_pct"] = round(ll * draw(st.floats(0.5, 1.0)), digits)
    if gaps:
        missing = draw(st.sets(st.sampled_from([*PASSING, "liquid_limit_pct", "plastic_limit_pct"]), max_size=6))
        cells = {name: value for name, value in cells.items() if name not in missing}
        cells["visual_group"] = draw(st.sampled_from([None, "SM", "CL", "CL/CH", "PT"]))
    return cells


def table(rows: list[dict[str, Any]]) -> pd.DataFrame:
    frame = pd.DataFrame(rows)
    if "visual_group" in frame:
        frame["visual_group"] = frame["visual_group"].astype("string")
    return frame


@given(st.lists(samples(), min_size=1, max_size=8))
@MANY
def test_a_sample_has_one_class_or_a_reason_with_the_classes_left(rows: list[dict[str, Any]]) -> None:
    found = classify_samples(table(rows), [system.NAME for system in SYSTEMS])
    for system in SYSTEMS:
        for _, row in found.iterrows():
            symbol, left = row[system.COLUMN], row[f"{system.COLUMN}_candidates"]
            reason = row[f"{system.COLUMN}_reason"]
            if pd.notna(symbol):
                assert symbol in system.SYMBOLS
                assert pd.isna(left)
                assert pd.notna(row[f"{system.COLUMN}_basis"])
            else:
                assert pd.notna(reason)
                assert pd.isna(row[f"{system.COLUMN}_basis"])
                alone = ("tests", "check the lab sheet", "is allowed", "no texture", "run a hydrometer")
                if pd.isna(left):
                    assert any(words in reason for words in alone), reason
                else:
                    assert len(left.split(";")) >= 2
                    assert set(left.split(";")) <= set(system.SYMBOLS)


@given(st.lists(samples(), min_size=2, max_size=8), st.randoms(use_true_random=False))
@MANY
def test_the_order_of_rows_changes_nothing(rows: list[dict[str, Any]], order: Any) -> None:
    wide = table(rows).assign(boring=[f"B{k // 4}" for k in range(len(rows))], row_number=range(2, 2 + len(rows)))
    wide["top_depth_m"] = [0.1 * (k % 4) for k in range(len(rows))]
    long = wide.reindex(columns=PASSING).melt(ignore_index=False, value_name="passing_pct").dropna()
    long["size_mm"] = long["variable"].map(size_from_passing_column)
    long = long.rename_axis("sample_row").reset_index()[["sample_row", "size_mm", "passing_pct"]]
    tests = wide.drop(columns=[name for name in PASSING if name in wide])
    records = describe(tests, long)
    places = list(range(len(rows)))
    order.shuffle(places)
    again = describe(tests.iloc[places], long.iloc[::-1]).loc[records.index]
    pd.testing.assert_frame_equal(records, again, check_categorical=False)
    pd.testing.assert_frame_equal(classify(records), classify(again), check_categorical=False)
    pd.testing.assert_frame_equal(
        classify_samples(wide), classify_samples(wide.iloc[places]).loc[wide.index], check_categorical=False
    )


@given(st.lists(samples(), min_size=1, max_size=8))
@MANY
def test_fractions_add_up_and_a_finer_sieve_never_passes_more(rows: list[dict[str, Any]]) -> None:
    wide = table(rows).assign(boring="B1", top_depth_m=np.arange(len(rows), dtype=float))
    points = [
        (k, size_from_passing_column(name), value)
        for k, cells in enumerate(rows)
        for name, value in cells.items()
        if name in PASSING
    ]
    long = pd.DataFrame(points, columns=["sample_row", "size_mm", "passing_pct"])
    records = describe(wide.drop(columns=[name for name in PASSING if name in wide]), long)
    total = records[["gravel_pct", "sand_pct", "fines_pct"]].sum(axis=1, skipna=False).dropna()
    np.testing.assert_allclose(total, 100.0)
    named = records[[passing_column(size) for size in (4.75, 2.0, 0.425, 0.075, 0.05, 0.002)]]
    falls = named.ffill(axis=1).diff(axis=1).fillna(0.0)
    assert (falls <= 1e-9).all(axis=None)
    assert not ((named < 0.0) | (named > 100.0)).any(axis=None)
    assert (records["cu_low"].fillna(1) <= records["cu"].fillna(np.inf)).all()
    assert (records["cc_low"].fillna(0) <= records["cc_high"].fillna(np.inf)).all()


NAMED = [passing_column(size) for size in (4.75, 2.0, 0.425, 0.15, 0.075)]


@given(
    samples(gaps=False, oversize=False),
    st.sampled_from([*NAMED, "liquid_limit_pct", "plastic_limit_pct"]),
    st.integers(-500, 499),
)
@settings(max_examples=80, deadline=None)
def test_more_digits_move_no_class_that_near_limit_did_not_warn_of(cells: dict[str, Any], name: str, part: int) -> None:
    digits = 0 if float(cells[name]).is_integer() else 1
    finer = round(cells[name] + part / 1000 / 10**digits, 5)
    assume(0 <= finer <= 100)
    changed = {**cells, name: finer}
    curve = [changed[column] for column in PASSING]
    assume(curve == sorted(curve, reverse=True))
    assume(changed["plastic_limit_pct"] >= 0)
    before, after = (classify_samples(table([row])).iloc[0] for row in (cells, changed))
    for column in ("uscs_symbol", "aashto_group"):
        is_same = before[column] == after[column] or pd.isna(before[column])
        assert is_same or before[f"{column}_near_limit"], (column, name, finer)


@pytest.mark.parametrize("digits", [0, 1])
def test_more_digits_of_any_sieve_of_many_curves_move_no_symbol_unwarned(digits: int) -> None:
    draw, count = np.random.default_rng(digits), 20_000
    fines = np.where(draw.random(count) < 0.7, draw.uniform(0, 14, count), draw.uniform(0, 100, count))
    rest = np.sort(draw.random((count, 5)), axis=1)
    curves = np.round(np.column_stack([fines, fines[:, None] + (100 - fines[:, None]) * rest]), digits)
    names = [passing_column(size) for size in (0.075, 0.15, 0.425, 2.0, 4.75, 9.5)]
    limits = pd.DataFrame({"is_nonplastic": draw.random(count) < 0.5, "liquid_limit_pct": 40.0})
    limits["plasticity_index_pct"] = draw.integers(10, 20, count).astype(float)
    before = classify_samples(limits.join(pd.DataFrame(curves, columns=names)), ["astm_d2487"])
    symbol, warned = before["uscs_symbol"].astype(object), before["uscs_symbol_near_limit"].fillna(True)
    moves = 0
    for place in range(len(names)):
        finer = curves.copy()
        finer[:, place] += draw.uniform(-0.4999, 0.4999, count) / 10**digits
        is_valid = (np.diff(finer, axis=1) >= 0).all(axis=1) & (finer.min(axis=1) >= 0) & (finer.max(axis=1) <= 100)
        after = classify_samples(limits.join(pd.DataFrame(finer, columns=names)), ["astm_d2487"], with_reasons=False)
        moved = is_valid & symbol.notna() & (symbol != after["uscs_symbol"].astype(object))
        assert not (moved & ~warned).any(), names[place]
        moves += moved.sum()
    assert moves > 0


@given(samples(gaps=False, oversize=False), st.data())
@MANY
def test_leaving_a_test_out_never_gives_another_class(cells: dict[str, Any], data: st.DataObject) -> None:
    # Two gaps are answers by rule, and not tried here: without the test after oven drying soil is inorganic, and a
    # non-plastic soil without a liquid limit is one whose liquid limit could not be had.
    cells = {name: value for name, value in cells.items() if name != "liquid_limit_oven_dried_pct"}
    cells["is_nonplastic"] = False
    full = pd.DataFrame([{**cells, "cu": 7.0, "cc": 2.0}])
    tests = [*NAMED, "liquid_limit_pct", "plastic_limit_pct", "cu", "cc"]
    gone = data.draw(st.sets(st.sampled_from(tests), min_size=1))
    before, after = (classify(frame).iloc[0] for frame in (full, full.drop(columns=list(gone))))
    for column in ("uscs_symbol", "aashto_group"):
        if pd.notna(after[column]):
            assert after[column] == before[column]
        elif pd.notna(after[f"{column}_candidates"]):
            assert before[column] in after[f"{column}_candidates"].split(";")
    if pd.notna(after["group_index"]):
        assert after["group_index"] == before["group_index"]


JAR_TESTS = ["organic_pct", "liquid_limit_pct", "moisture_pct", "cu"]


@st.composite
def jars(draw: st.DrawFn) -> pd.DataFrame:
    """Return rows of two borings at depths that nearly meet, each with some of three tests."""
    count = draw(st.integers(1, 10))
    tenths = st.integers(0, 20)
    rows = []
    for k in range(count):
        top = draw(tenths) / 10
        row = {"boring": draw(st.sampled_from(["A", "B"])), "sample": draw(st.sampled_from([None, "S1", "S2"]))}
        row |= {"top_depth_m": top, "base_depth_m": top + draw(tenths) / 20, "row_number": k}
        for test in draw(
            st.sets(st.sampled_from(["organic_pct", "liquid_limit_pct", "moisture_pct", "cu"]), min_size=1)
        ):
            row[test] = float(draw(st.integers(1, 3)))
        rows.append(row)
    return pd.DataFrame(rows).astype({"sample": "string"})


@given(jars(), st.randoms(use_true_random=False))
@MANY
def test_specimens_hold_no_test_twice_and_their_depths_meet(rows: pd.DataFrame, order: Any) -> None:
    none = pd.DataFrame(columns=["sample_row", "size_mm", "passing_pct"])
    specimen = join(rows, none)["specimen"]
    for _, part in rows.groupby(specimen):
        assert part["boring"].nunique() == 1
        assert part["top_depth_m"].max() - part["base_depth_m"].min() <= TOLERANCE_M + 1e-6
        for test in JAR_TESTS:
            if test in part and part[test].notna().sum() > 1:
                assert part["sample"].nunique(dropna=False) == 1 or part[test].nunique() == 1
                assert part[test].nunique() == 1
    places = list(range(len(rows)))
    order.shuffle(places)
    again = join(rows.iloc[places], none)["specimen"].loc[rows.index]
    assert specimen.tolist() == again.tolist()
