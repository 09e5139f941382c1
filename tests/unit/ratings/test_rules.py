"""Rule sets on tables: what comes out, on which index, and the search against a plain reading of the rules."""

from __future__ import annotations

import itertools

import numpy as np
import pandas as pd
import pytest

from geomap.ratings import rules
from geomap.ratings.conditions import condition_from_text
from geomap.ratings.rules import NOT_ASSESSED, Rule, RuleSet

NAN = np.nan


def rule_set(*entries: tuple[str, str, bool], name: str = "test") -> RuleSet:
    """A set of rules given as condition, result, and whether silence is no."""
    made = tuple(
        Rule(f"r{k}", f"clause {k}", condition_from_text(when), result, f"word {k}", silence)
        for k, (when, result, silence) in enumerate(entries)
    )
    return RuleSet(name, "title", "source", "1", "none", "constructed", "in_place", made)


SETS = [
    rule_set(("liquid_limit_pct > 50", "unsuitable", False), ("True", "suitable", False)),
    rule_set(("liquid_limit_pct > 50", "treat", False), ("plasticity_index_pct > 20", "treat", False)),
    rule_set(
        ("organic_pct > 5", "unsuitable", True),
        ("liquid_limit_pct > 50 and plasticity_index_pct > 20", "treat", False),
        ("liquid_limit_pct <= 50", "suitable", False),
    ),
    rule_set(("liquid_limit_pct > 50", "not assessed", False), ("plasticity_index_pct > 20", "suitable", False)),
    rule_set(("True", "treat", False)),
    rule_set(("False", "treat", False)),
]
SOILS = pd.DataFrame(
    list(itertools.product((30.0, 60.0, NAN), (10.0, 30.0, NAN), (2.0, 8.0, NAN))),
    columns=["liquid_limit_pct", "plasticity_index_pct", "organic_pct"],
)


def plain_verdict(criteria: RuleSet, soil: pd.DataFrame) -> str:
    """Every rule in turn, as one would with a pencil."""
    answers = set()
    for rule in criteria.rules:
        truth = rule.condition.judge({name: soil[name].to_numpy() for name in soil}, 1)
        if truth.yes[0]:
            answers.add(rule.result)
            break
        if truth.unknown[0] and not rule.silence_is_no:
            answers.add(rule.result)
    else:
        answers.add("not assessed")
    return answers.pop() if len(answers) == 1 else "not assessed"


@pytest.mark.parametrize("criteria", SETS)
def test_verdicts_are_those_of_a_plain_reading(criteria: RuleSet) -> None:
    expected = [plain_verdict(criteria, SOILS.iloc[[k]]) for k in range(len(SOILS))]
    assert rules.rate(SOILS, [criteria])["suitability"].tolist() == expected


@pytest.mark.parametrize("criteria", SETS)
def test_a_rule_is_named_only_where_it_is_met(criteria: RuleSet) -> None:
    rated = rules.rate(SOILS, [criteria])
    table = {name: SOILS[name].to_numpy() for name in SOILS}
    met = np.array([rule.condition.judge(table, len(SOILS)).yes for rule in criteria.rules])
    for k, text in enumerate(rated["rule"]):
        named = [n for n, rule in enumerate(criteria.rules) if text == f"test {rule.id}: {rule.clause}"]
        assert all(met[n, k] for n in named)
        assert named or text.startswith("test: not assessed, ")
        assert (rated["suitability"].iloc[k] == "not assessed") or named


@pytest.mark.parametrize("criteria", SETS)
def test_what_a_soil_needs_is_missing_and_given_it_would_be_assessed_or_no_rule_is_met(criteria: RuleSet) -> None:
    rated = rules.rate(SOILS, [criteria])
    for k, reason in enumerate(rated["suitability_reason"].fillna("")):
        if not reason.startswith("not assessed, needs "):
            continue
        needed = reason.removeprefix("not assessed, needs ").split(", ")
        assert SOILS.loc[k, needed].isna().all()
        filled = pd.DataFrame(list(itertools.product((2.0, 100.0), repeat=len(needed))), columns=needed)
        worlds = filled.assign(**{name: SOILS.loc[k, name] for name in SOILS if name not in needed})
        answers = rules.rate(worlds, [criteria])
        assert not answers["rule"].str.contains("needs").any()
        assert answers["suitability"].nunique() > 1


def test_only_the_columns_missing_for_that_soil_are_named() -> None:
    rated = rules.rate(SOILS, [SETS[2]])
    said = dict(zip(SOILS.itertuples(index=False, name=None), rated["suitability_reason"].fillna(""), strict=True))
    by_text = {str(soil): text for soil, text in said.items()}
    assert by_text[str((NAN, 10.0, 2.0))] == "not assessed, needs liquid_limit_pct"
    assert by_text[str((60.0, NAN, 2.0))] == "not assessed, needs plasticity_index_pct"
    assert by_text[str((NAN, NAN, 2.0))] == "not assessed, needs liquid_limit_pct, plasticity_index_pct"
    assert by_text[str((60.0, 10.0, 2.0))] == "not assessed, no rule is met"
    assert by_text[str((30.0, NAN, NAN))] == ""


def test_a_rule_may_itself_say_that_the_soil_is_not_assessed_and_is_then_named() -> None:
    row = rules.rate(SOILS.assign(liquid_limit_pct=60.0), [SETS[3]]).iloc[0]
    assert (row["suitability"], row["rule"], row["suitability_reason"]) == (
        "not assessed",
        "test r0: clause 0",
        "r0: clause 0",
    )
    assert row["subgrade_rating"] == "word 0"


def test_nothing_is_asked_for_that_could_not_change_the_verdict() -> None:
    soil = pd.DataFrame({"liquid_limit_pct": [NAN], "plasticity_index_pct": [10.0]})
    assert rules.rate(soil, [SETS[3]])["suitability_reason"].tolist() == ["not assessed, no rule is met"]


def test_codes_give_the_rule_that_decided_or_none() -> None:
    table = {"liquid_limit_pct": np.array([60.0, 30.0, NAN])}
    verdict, rule = SETS[0].codes(table, 3)
    assert verdict.tolist() == [rules.UNSUITABLE, rules.SUITABLE, NOT_ASSESSED]
    assert rule.tolist() == [0, 1, -1]
    assert (verdict.dtype, rule.dtype) == (np.int8, np.int16)


def test_a_set_may_look_at_more_columns_than_an_integer_has_bits() -> None:
    names = [name for name, c in rules_columns().items() if c == "number"]
    many = rule_set(*((f"{name} > 1", "treat", False) for name in names), ("True", "suitable", False))
    row = rules.rate(pd.DataFrame(index=[0]), [many]).iloc[0]
    assert row["suitability_reason"] == f"not assessed, needs {', '.join(names)}"


def rules_columns() -> dict[str, str]:
    from geomap.ratings.vocabulary import soil_columns

    return {name: column.type for name, column in soil_columns().items()}


@pytest.mark.parametrize("rows", [0, 5])
def test_the_index_is_kept_and_the_input_untouched(rows: int) -> None:
    soils = SOILS.iloc[:rows].set_axis([f"s{k}" for k in range(rows)])
    before = soils.copy(deep=True)
    rated = rules.rate(soils, SETS)
    assert rated.index.equals(soils.index)
    assert list(rated) == ["suitability", "suitability_reason", "rule", "subgrade_rating", "verdict"]
    pd.testing.assert_frame_equal(soils, before)


def test_the_worst_of_several_sets_governs_with_its_own_words() -> None:
    mild, lost = rule_set(("True", "treat", False), name="mild"), rule_set(("False", "treat", False), name="lost")
    rated = rules.rate(SOILS.iloc[:1], [mild, lost]).iloc[0]
    assert (rated["suitability"], rated["rule"]) == ("not assessed", "lost: not assessed, no rule is met")
    assert pd.isna(rated["subgrade_rating"])
