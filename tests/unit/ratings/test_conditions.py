"""Conditions, against a plain evaluation of each row by possible worlds."""

from __future__ import annotations

import itertools

import numpy as np
import pytest

from geomap.ratings.conditions import Truth, condition_from_text
from geomap.tables import schema

NAN = np.nan
VALUES = (10.0, 60.0, NAN)
TABLE = {
    name: np.array(column)
    for name, column in zip(
        ("liquid_limit_pct", "plasticity_index_pct", "fines_pct"),
        zip(*itertools.product(VALUES, repeat=3), strict=True),
        strict=True,
    )
}
ROWS = len(VALUES) ** 3

# Each name comes up once, so that Kleene's logic and the possible worlds agree.
CONDITIONS = [
    "liquid_limit_pct > 50",
    "not liquid_limit_pct > 50",
    "liquid_limit_pct > 50 and plasticity_index_pct > 50",
    "liquid_limit_pct > 50 or plasticity_index_pct > 50",
    "(liquid_limit_pct > 50 and plasticity_index_pct > 50) or fines_pct > 50",
    "not (liquid_limit_pct <= 50 or plasticity_index_pct != 60) and fines_pct in [10, 11]",
    "True and fines_pct not in [10]",
    "False or fines_pct == 10",
]


def possible_answers(text: str, row: dict[str, float]) -> set[bool]:
    """What the condition can come to when each missing value is any value."""
    worlds = itertools.product(*[VALUES[:2] if np.isnan(v) else (v,) for v in row.values()])
    return {bool(eval(text, {}, dict(zip(row, world, strict=True)))) for world in worlds}  # noqa: S307


@pytest.mark.parametrize("text", CONDITIONS)
def test_a_condition_is_unknown_just_where_the_missing_values_can_turn_it(text: str) -> None:
    truth = condition_from_text(text).judge(TABLE, ROWS)
    for k in range(ROWS):
        answers = possible_answers(text, {name: column[k] for name, column in TABLE.items()})
        assert truth.yes[k] == (answers == {True})
        assert truth.no[k] == (answers == {False})


@pytest.mark.parametrize("text", CONDITIONS)
def test_gaps_are_the_missing_columns_that_can_turn_the_condition(text: str) -> None:
    condition = condition_from_text(text)
    gaps = dict(condition.gaps(TABLE, ROWS))
    assert set(gaps) == set(condition.columns)
    for k in range(ROWS):
        row = {name: column[k] for name, column in TABLE.items()}
        for name in condition.columns:
            others = itertools.product(*[VALUES[:2] if np.isnan(v) else (v,) for v in row.values()])
            matters = np.isnan(row[name]) and any(
                len(possible_answers(text, {**dict(zip(row, world, strict=True)), name: NAN})) == 2 for world in others
            )
            assert gaps[name][k] == matters


def test_a_column_that_the_table_lacks_is_missing_throughout() -> None:
    truth = condition_from_text("organic_pct > 5 or liquid_limit_pct > 50").judge(TABLE, ROWS)
    assert truth.yes.tolist() == (TABLE["liquid_limit_pct"] > 50).tolist()
    assert not truth.no.any()


def test_unknown_is_what_is_neither() -> None:
    truth = Truth(np.array([True, False, False]), np.array([False, True, False]))
    assert truth.unknown.tolist() == [False, False, True]


def test_a_word_of_the_standard_is_taken_and_another_is_not_where_the_words_are_given() -> None:
    symbols = {"uscs_symbol": ("CL", "CH")}
    assert condition_from_text("uscs_symbol in ['CL', 'CH']", symbols).columns == ("uscs_symbol",)
    assert condition_from_text("usda_texture == 'mud'", symbols).columns == ("usda_texture",)
    with pytest.raises(ValueError, match="uscs_symbol is never 'MH' but one of CL, CH"):
        condition_from_text("uscs_symbol == 'MH'", symbols)


def test_every_column_that_is_read_as_less_or_more_than_is_compared_with_its_bound() -> None:
    for column in schema.columns().values():
        if column.censored:
            table = {column.name: np.array([5.0, 5.0]), f"{column.name}_bound": np.array(["<", None], dtype=object)}
            truth = condition_from_text(f"{column.name} > 3").judge(table, 2)
            assert (truth.yes.tolist(), truth.unknown.tolist()) == ([False, True], [True, False])
