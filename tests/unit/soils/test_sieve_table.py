"""The column form of curves answers as the point form does."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomap.soils.gradation import Curves, curves_from_long
from geomap.soils.sieve_table import SieveTable, table_from_wide
from geomap.tables import schema

SIZES = [100.0, 75.0, 19.0, 4.75, 0.425, 0.075, 0.002]


@st.composite
def tables(draw: st.DrawFn) -> SieveTable:
    """Return up to six curves on some of `SIZES`, with gaps."""
    sizes = draw(st.lists(st.sampled_from(SIZES), unique=True, max_size=6).map(sorted))
    percent = st.integers(0, 200).map(lambda half: half / 2)
    rows = draw(
        st.lists(st.lists(percent, min_size=len(sizes), max_size=len(sizes)).map(sorted), min_size=1, max_size=6)
    )
    frame = pd.DataFrame(rows, columns=[schema.passing_column(size) for size in sizes], dtype=float)
    gaps = draw(st.lists(st.booleans(), min_size=frame.size, max_size=frame.size))
    return table_from_wide(frame.mask(np.array(gaps, dtype=bool).reshape(frame.shape)))


def test_rises_within_rounding_are_flattened_alike() -> None:
    draw = np.random.default_rng(3)
    curves = np.sort(draw.uniform(0, 100, (500, 6)), axis=1) + draw.choice([0, 0, 0.6, -0.6], (500, 6))
    wide = pd.DataFrame(curves.clip(0, 100), columns=[schema.passing_column(size) for size in sorted(SIZES)[:6]])
    long = wide.melt(ignore_index=False, value_name="passing_pct")
    long["size_mm"] = long["variable"].map(schema.size_from_passing_column)
    points, table = curves_from_long(long, long.index.to_numpy(), len(wide)), table_from_wide(wide)
    assert 0 < points.is_rejected.sum() < len(wide)
    assert points.is_rejected.tolist() == table.is_rejected.tolist()
    for size in sorted(SIZES)[:6]:
        assert table.passing(size)[0] == pytest.approx(points.passing(size)[0], nan_ok=True)


def by_points(table: SieveTable) -> Curves:
    if not table.columns:
        empty = np.zeros(0)
        return Curves(empty, empty, np.zeros(len(table) + 1, dtype=np.int64), table.is_rejected)
    return table.curves(np.arange(len(table)))


@given(tables(), st.sampled_from([300.0, 75.0, 4.75, 2.0, 0.425, 0.075, 0.05, 0.002, 0.001]))
@settings(max_examples=200, deadline=None)
def test_percent_passing_is_the_same(table: SieveTable, size: float) -> None:
    found, how = table.passing(size)
    expected, expected_how = by_points(table).passing(size)
    assert found == pytest.approx(expected, abs=1e-9, nan_ok=True)
    assert how.tolist() == expected_how.tolist()


@given(tables(), st.sampled_from([10.0, 30.0, 59.5, 60.0]), st.booleans())
@settings(max_examples=200, deadline=None)
def test_d_sizes_are_the_same(table: SieveTable, target: float, one_for_each: bool) -> None:
    asked = np.linspace(0.4, 1.0, len(table)) * target if one_for_each else target
    found, expected = table.size(asked), by_points(table).size(asked)
    for one, other in ((found.size_mm, expected.size_mm), (found.low_mm, expected.low_mm)):
        assert one == pytest.approx(other, rel=1e-9, nan_ok=True)
    assert found.high_mm == pytest.approx(expected.high_mm, rel=1e-9)


@given(tables())
@settings(max_examples=50, deadline=None)
def test_samples_can_be_taken_in_any_order(table: SieveTable) -> None:
    rows = np.arange(len(table))[::-1]
    assert table.take(rows).passing(0.425)[0] == pytest.approx(table.passing(0.425)[0][::-1], nan_ok=True)
    assert table.take(rows).is_empty.tolist() == table.is_empty.tolist()[::-1]
    points = by_points(table)
    assert points.take(rows).passing(0.425)[0] == pytest.approx(points.passing(0.425)[0][::-1], nan_ok=True)
