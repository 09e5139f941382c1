"""What a rule set says about a soil, as an engineer would check it with a pencil.

The words of ``general_subgrade`` are those of TM 3-357 (1953, rev. 1957), Appendix B, Table B-1, as far as they could
be confirmed; the suitability beside them is common practice, no source, and the rule set says so.
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from geomap.errors import UsageError
from geomap.ratings import rules
from geomap.soils.systems import SYSTEMS, astm_d2487

NAN = np.nan


def soils(rows: list[dict[str, object]]) -> pd.DataFrame:
    table = pd.DataFrame(rows)
    for name in ("uscs_symbol", "aashto_group", "origin"):
        table[name] = pd.Series(table.get(name), index=table.index, dtype="string")
    for name in ("liquid_limit_pct", "plasticity_index_pct", "organic_pct"):
        table[name] = pd.Series(table.get(name, NAN), index=table.index, dtype="float64")
    table["is_nonplastic"] = pd.Series(table.get("is_nonplastic", False), index=table.index, dtype="boolean")
    return table.assign(is_nonplastic=table["is_nonplastic"].fillna(False))  # as in a record: never missing


GENERAL = [
    # soil                                                                        verdict         word of the source
    ({"uscs_symbol": "GW"}, "suitable", "excellent"),
    ({"uscs_symbol": "GP"}, "suitable", "good to excellent"),
    ({"uscs_symbol": "GM", "liquid_limit_pct": 28, "plasticity_index_pct": 6}, "suitable", "good to excellent"),
    ({"uscs_symbol": "GM", "liquid_limit_pct": 29, "plasticity_index_pct": 6}, "suitable", "good"),
    ({"uscs_symbol": "GM", "is_nonplastic": True}, "suitable", "good to excellent"),
    ({"uscs_symbol": "GC"}, "suitable", "good"),
    ({"uscs_symbol": "SW"}, "suitable", "good"),
    ({"uscs_symbol": "SP"}, "suitable", "fair to good"),
    ({"uscs_symbol": "SM", "liquid_limit_pct": 20, "plasticity_index_pct": 3}, "suitable", "fair to good"),
    ({"uscs_symbol": "SM", "liquid_limit_pct": 35, "plasticity_index_pct": 8}, "suitable", "fair"),
    ({"uscs_symbol": "SC"}, "suitable", "poor to fair"),
    ({"uscs_symbol": "ML"}, "suitable", "poor to fair"),
    ({"uscs_symbol": "CL"}, "suitable", "poor to fair"),
    ({"uscs_symbol": "MH"}, "treat", "poor"),
    ({"uscs_symbol": "CH"}, "treat", "poor to fair"),
    ({"uscs_symbol": "OL"}, "unsuitable", "poor"),
    ({"uscs_symbol": "OH"}, "unsuitable", "poor to very poor"),
    ({"uscs_symbol": "PT"}, "unsuitable", "not suitable"),
    # a dual symbol takes the poorer of its parents
    ({"uscs_symbol": "GP-GC"}, "suitable", "good"),
    ({"uscs_symbol": "SP-SM"}, "suitable", "fair"),
    ({"uscs_symbol": "SC-SM"}, "suitable", "poor to fair"),
    ({"uscs_symbol": "CL-ML"}, "suitable", "poor to fair"),
    # where the limits are not known both rows of GM and SM are suitable, and the word is that of the poorer
    ({"uscs_symbol": "GM"}, "suitable", "good"),
    ({"uscs_symbol": "SM"}, "suitable", "fair"),
    # origin and organic matter go before the group
    ({"uscs_symbol": "CL", "origin": "topsoil"}, "unsuitable", None),
    ({"uscs_symbol": "GW", "origin": "made ground"}, "treat", None),
    ({"uscs_symbol": "CL", "organic_pct": 5.0}, "suitable", "poor to fair"),
    ({"uscs_symbol": "CL", "organic_pct": 5.1}, "unsuitable", None),
    ({"aashto_group": "A-8"}, "unsuitable", "not suitable"),
    # without a symbol, only what is known otherwise decides
    ({"origin": "made ground"}, "treat", None),
    ({"origin": "topsoil"}, "unsuitable", None),
    ({"organic_pct": 6.0}, "unsuitable", None),
]


@pytest.mark.parametrize(("soil", "verdict", "word"), GENERAL, ids=[str(s) for s, _, _ in GENERAL])
def test_general_subgrade(soil: dict[str, object], verdict: str, word: str | None) -> None:
    row = rules.rate(soils([soil]), [rules.read_rule_set("general_subgrade")]).iloc[0]
    assert row["suitability"] == verdict
    assert (None if pd.isna(row["subgrade_rating"]) else row["subgrade_rating"]) == word
    assert row["rule"].startswith("general_subgrade ")


NOT_ASSESSED = [
    # soil                                                             what it needs
    ({"liquid_limit_pct": 30, "plasticity_index_pct": 8}, "uscs_symbol"),
    ({"is_nonplastic": True}, "uscs_symbol"),
    ({"liquid_limit_pct": 30}, "uscs_symbol"),  # over 28, the rows GM d and SM d are out whatever the index is
    ({"liquid_limit_pct": 20}, "uscs_symbol, plasticity_index_pct"),
    ({}, "uscs_symbol, liquid_limit_pct, plasticity_index_pct"),
    ({"origin": "natural", "aashto_group": "A-6"}, "uscs_symbol, liquid_limit_pct, plasticity_index_pct"),
]


@pytest.mark.parametrize(("soil", "needs"), NOT_ASSESSED, ids=[str(s) for s, _ in NOT_ASSESSED])
def test_a_soil_that_is_not_assessed_says_what_it_needs_and_names_no_rule(soil: dict[str, object], needs: str) -> None:
    row = rules.rate(soils([soil]), [rules.read_rule_set("general_subgrade")]).iloc[0]
    assert row["suitability"] == "not assessed"
    assert row["suitability_reason"] == f"not assessed, needs {needs}"
    assert row["rule"] == f"general_subgrade: not assessed, needs {needs}"
    assert pd.isna(row["subgrade_rating"])


def test_a_symbol_that_no_rule_knows_is_not_assessed() -> None:
    row = rules.rate(soils([{"uscs_symbol": "XX"}]), [rules.read_rule_set("general_subgrade")]).iloc[0]
    assert row["suitability_reason"] == "not assessed, no rule is met"
    assert row["rule"] == "general_subgrade: not assessed, no rule is met"


# Subgrade column of TM 3-357 App. B Table B-1, from memory: the words of the rules, row by row.
WORDS = {
    "GW": "excellent",
    "GP": "good to excellent",
    "GM-d": "good to excellent",
    "GM-u": "good",
    "GC": "good",
    "SW": "good",
    "SP": "fair to good",
    "SM-d": "fair to good",
    "SM-u": "fair",
    "SC": "poor to fair",
    "ML": "poor to fair",
    "CL": "poor to fair",
    "OL": "poor",
    "MH": "poor",
    "CH": "poor to fair",
    "OH": "poor to very poor",
    "peat": "not suitable",
}
FROM_MEMORY = {"GC", "peat"}


def test_every_row_of_the_table_has_its_word_and_says_what_is_from_memory() -> None:
    by_id = {rule.id: rule for rule in rules.read_rule_set("general_subgrade").rules}
    assert {name: by_id[name].rating for name in WORDS} == WORDS
    assert {name for name in WORDS if by_id[name].flag.startswith("from memory")} == FROM_MEMORY
    assert all(by_id[name].flag.startswith("partly seen: ") for name in WORDS.keys() - FROM_MEMORY)
    assert all(rule.flag for rule in by_id.values())


def test_every_symbol_of_the_standard_is_judged_by_the_general_set() -> None:
    table = soils([{"uscs_symbol": symbol} for symbol in astm_d2487.SYMBOLS])
    rated = rules.rate(table, [rules.read_rule_set("general_subgrade")])
    assert "not assessed" not in set(rated["suitability"])
    assert rated["subgrade_rating"].notna().all()


HEAD = """
title = "Test set"
source = "constructed for this test"
edition = "1"
jurisdiction = "none"
flag = "constructed"
applies_to = "in_place"
"""


def rule(when: str, result: str = "unsuitable", more: str = "", name: str = "r") -> str:
    return f"\n[[rules]]\nid = '{name}'\nclause = 'c'\nwhen = '''{when}'''\nresult = '{result}'\n{more}\n"


REST = rule("True", "suitable", name="rest")


LOGIC = [
    # condition                                            LL    PI    verdict
    ("liquid_limit_pct > 50", 60, NAN, "unsuitable"),
    ("liquid_limit_pct > 50", 50, NAN, "suitable"),
    ("liquid_limit_pct > 50", NAN, NAN, "not assessed"),
    ("liquid_limit_pct > 50 and plasticity_index_pct > 20", 40, NAN, "suitable"),  # no, whatever PI is
    ("liquid_limit_pct > 50 and plasticity_index_pct > 20", 60, NAN, "not assessed"),
    ("liquid_limit_pct > 50 or plasticity_index_pct > 20", 60, NAN, "unsuitable"),  # yes, whatever PI is
    ("liquid_limit_pct > 50 or plasticity_index_pct > 20", 40, NAN, "not assessed"),
    ("not liquid_limit_pct > 50", NAN, NAN, "not assessed"),
    ("not liquid_limit_pct > 50", 40, NAN, "unsuitable"),
    ('uscs_symbol in ["CH"]', NAN, NAN, "not assessed"),
]


@pytest.mark.parametrize(("when", "limit", "index", "verdict"), LOGIC)
def test_missing_is_neither_yes_nor_no(when: str, limit: float, index: float, verdict: str) -> None:
    rule_set = rules.parse_rule_set(HEAD + rule(when) + REST, "test")
    table = soils([{"liquid_limit_pct": limit, "plasticity_index_pct": index}])
    assert rules.rate(table, [rule_set])["suitability"].tolist() == [verdict]


REPORTED = [
    # condition                     as reported   verdict: a bound is used as far as it decides
    ("cbr_soaked_pct < 3", "<3", "unsuitable"),
    ("cbr_soaked_pct < 3", "<2", "unsuitable"),
    ("cbr_soaked_pct < 3", "<5", "not assessed"),
    ("cbr_soaked_pct < 3", ">3", "suitable"),
    ("cbr_soaked_pct < 3", ">2", "not assessed"),
    ("cbr_soaked_pct < 3", "3", "suitable"),
    ("cbr_soaked_pct >= 3", "<3", "suitable"),
    ("cbr_soaked_pct > 3", ">3", "unsuitable"),
    ("cbr_soaked_pct > 3", "<5", "not assessed"),
    ("cbr_soaked_pct == 3", "<3", "suitable"),
    ("cbr_soaked_pct == 3", "<5", "not assessed"),
    ("cbr_soaked_pct in [3, 4]", ">4", "suitable"),
    ("cbr_soaked_pct in [3, 4]", ">3", "not assessed"),
    ("not cbr_soaked_pct >= 3", "<3", "unsuitable"),
]


@pytest.mark.parametrize(("when", "reported", "verdict"), REPORTED)
def test_less_than_and_more_than_decide_as_far_as_they_reach(when: str, reported: str, verdict: str) -> None:
    table = pd.DataFrame({"cbr_soaked_pct": [float(reported.strip("<>")), 3.5], "cbr_soaked_pct_bound": pd.NA})
    table["cbr_soaked_pct_bound"] = pd.array([reported[0] if reported[0] in "<>" else None, None], dtype="string")
    rule_set = rules.parse_rule_set(HEAD + rule(when) + REST, "test")
    assert rules.rate(table, [rule_set])["suitability"].iloc[0] == verdict


def test_a_rule_may_say_that_silence_is_no() -> None:
    text = HEAD + rule("organic_pct > 5", more='when_missing = "not_met"') + REST
    table = soils([{"organic_pct": NAN}, {"organic_pct": 6}])
    assert rules.rate(table, [rules.parse_rule_set(text, "test")])["suitability"].tolist() == ["suitable", "unsuitable"]


def test_of_several_rule_sets_the_worst_governs_and_is_named() -> None:
    mild = rules.parse_rule_set(HEAD + rule("True", "treat"), "mild")
    strict = rules.parse_rule_set(HEAD + rule("liquid_limit_pct > 50") + REST, "strict")
    rated = rules.rate(soils([{"liquid_limit_pct": 60}, {"liquid_limit_pct": 30}]), [mild, strict])
    assert rated["suitability"].tolist() == ["unsuitable", "treat"]
    assert [r.split()[0] for r in rated["rule"]] == ["strict", "mild"]


BAD = [
    # conditions
    (HEAD + rule("liquid_limit > 50"), "there is no column 'liquid_limit'; did you mean liquid_limit_pct?"),
    (HEAD + rule("PI > 50"), "there is no column 'PI'; did you mean plasticity_index_pct?"),
    (HEAD + rule("boring == 'B1'"), "'boring' is not a column that describes soil"),
    (HEAD + rule("top_depth_m < 0.3"), "'top_depth_m' is not a column that describes soil"),
    (HEAD + rule("suitability == 'treat'"), "'suitability' is not a column that describes soil"),
    (HEAD + rule("passing_0_07_mm_pct > 5"), "did you mean passing_0_075_mm_pct?"),
    (HEAD + rule("liquid_limit_pct >"), "cannot be read"),
    (HEAD + rule("not " * 5000 + "True"), "cannot be read"),
    (HEAD + rule("liquid_limit_pct > 'CH'"), "is compared with 0 to 500"),
    (HEAD + rule("liquid_limit_pct > True"), "is compared with 0 to 500"),
    (HEAD + rule("liquid_limit_pct > 1e999"), "is compared with 0 to 500"),
    (HEAD + rule("is_nonplastic == 1"), "is compared with yes or no"),
    (HEAD + rule("uscs_symbol == 3"), "is compared with text"),
    (HEAD + rule("uscs_symbol > 'CH'"), "by ==, !=, in or not in"),
    (HEAD + rule("liquid_limit_pct is 5"), "is not a comparison with =="),
    (HEAD + rule("uscs_symbol in []"), "the list is empty"),
    (HEAD + rule("uscs_symbol in 'CH'"), "a list goes with `in`"),
    (HEAD + rule("liquid_limit_pct > plastic_limit_pct"), "'plastic_limit_pct' is not a number"),
    (HEAD + rule("origin == 'top soil'"), "did you mean 'topsoil'?"),
    (HEAD + rule("origin in ['rock', 'fill']"), "origin is never 'fill' but one of natural, made ground, topsoil"),
    (HEAD + rule("__import__('os').system('x')"), "is not a comparison"),
    (HEAD + rule("1 < liquid_limit_pct < 2"), "is not a comparison"),
    # words of the file
    (HEAD + rule("True", "bad"), "allowed: suitable, treat, unsuitable, not assessed"),
    (HEAD + rule("True", "unsuitible"), "did you mean unsuitable?"),
    (HEAD + rule("True", more="when_missing = 'no'"), "allowed: unknown, not_met"),
    (HEAD + rule("True", more="because = 'x'"), "found 'because'"),
    (HEAD + rule("True", more="raiting = 'x'"), "did you mean rating?"),
    (HEAD + rule("True", more="rating = 3"), "rating: found '3'; allowed: a text"),
    (HEAD + rule("True").replace("'''True'''", "5"), "when: found '5'; allowed: a text"),
    (HEAD + rule("True", name=" "), "id: found ' '; allowed: a text; fill it in"),
    (HEAD + rule("True").replace("id = 'r'", "id = 7"), "rule number 1: id: found '7'; allowed: a text"),
    (HEAD + rule("True").replace("id = 'r'", ""), "rule number 1: found 'no id'"),
    (HEAD + rule("True") + rule("True"), "rule number 2: found 'r'; allowed: an id of its own"),
    (HEAD.replace("in_place", "roads") + rule("True"), "allowed: in_place"),
    (HEAD.replace('"in_place"', '["in_place"]') + rule("True"), "applies_to: found \"['in_place']\"; allowed: a text"),
    (HEAD.replace('edition = "1"', "") + rule("True"), "no edition"),
    (HEAD.replace('edition = "1"', "edition = 1953") + rule("True"), "put it in quotation marks"),
    (HEAD.replace('"constructed for this test"', '""') + rule("True"), "source: found ''; allowed: a text; fill it in"),
    ("title = ", "TOML"),
    # rules that are none
    (HEAD, "found 'no rules'"),
    (HEAD + "rules = []", "rules: found '[]'; allowed: one table or more"),
    (HEAD + "rules = 'x'", "rules: found 'x'; allowed: one table or more"),
    (HEAD + "rules = [1]", "rules: found '[1]'; allowed: one table or more"),
    (HEAD + "[rules]\nid = 'r'", "allowed: one table or more"),
    # thresholds
    (HEAD + "thresholds = 0.5" + rule("True"), "thresholds: found '0.5'; allowed: a table"),
    (HEAD + "[thresholds]\nunsuitable_form = 0.4" + rule("True"), "did you mean unsuitable_from?"),
    (
        HEAD + "[thresholds]\nunsuitable_from = 0" + rule("True"),
        "unsuitable_from: found '0'; allowed: a number greater",
    ),
    (HEAD + "[thresholds]\nunsuitable_from = 1.01" + rule("True"), "allowed: a number greater than 0, at most 1"),
    (HEAD + "[thresholds]\nunsuitable_from = nan" + rule("True"), "allowed: a number greater than 0, at most 1"),
    (HEAD + "[thresholds]\nunsuitable_from = true" + rule("True"), "allowed: a number greater than 0, at most 1"),
    (HEAD + "[thresholds]\nunsuitable_from = '0.4'" + rule("True"), "allowed: a number greater than 0, at most 1"),
]


@pytest.mark.parametrize(("text", "message"), BAD, ids=[message for _, message in BAD])
def test_a_bad_rule_file_is_refused_with_the_reason(text: str, message: str) -> None:
    with pytest.raises(UsageError) as caught:
        rules.parse_rule_set(text, "own.toml")
    assert message in str(caught.value)
    assert str(caught.value).startswith("own.toml")


def test_the_message_names_the_line_of_the_rule() -> None:
    text = HEAD + rule("True", name="first") + rule("LL > 5", name="second")
    line = text.splitlines().index("id = 'second'") + 1
    with pytest.raises(UsageError, match=rf"own\.toml:{line}: rule second: when: found 'LL > 5'"):
        rules.parse_rule_set(text, "own.toml")


INLINE = "{id = 'r', clause = 'c', when = 'True', result = 'treat'}"
WRITINGS = [
    HEAD + rule("True", name="a") + rule("True", name="b"),
    (HEAD + rule("True", name="a") + rule("True", name="b")).replace("[[rules]]", "[[rules]] # a comment"),
    (HEAD + rule("True", name="a") + rule("True", name="b")).replace("[[rules]]", '[[ "rules" ]]'),
    HEAD + f"rules = [{INLINE}, {INLINE.replace(chr(39) + 'r' + chr(39), chr(39) + 's' + chr(39))}]",
    HEAD + rule("True", name="a") + "# [[rules]]\n# id = 'b'\n" + rule("True", name="b"),
]


@pytest.mark.parametrize("text", WRITINGS)
def test_no_rule_is_lost_however_toml_writes_the_list(text: str) -> None:
    assert len(rules.parse_rule_set(text, "test").rules) == 2


SYMBOLS = {system.COLUMN: system.SYMBOLS for system in SYSTEMS}
WRONG_SYMBOLS = [
    ("uscs_symbol == 'ch'", "did you mean 'CH'?"),
    ("uscs_symbol in ['CH', 'GM-GC']", "uscs_symbol is never 'GM-GC'"),
    ("aashto_group == 'A-7-56'", "did you mean 'A-7-6'?"),
    ("usda_texture == 'silty loam'", "did you mean 'silt loam'?"),
]


@pytest.mark.parametrize(("when", "message"), WRONG_SYMBOLS)
def test_a_symbol_that_the_standard_does_not_have_is_refused(when: str, message: str) -> None:
    with pytest.raises(UsageError) as caught:
        rules.parse_rule_set(HEAD + rule(when), "own.toml", SYMBOLS)
    assert message in str(caught.value)
    assert rules.parse_rule_set(HEAD + rule(when), "own.toml").rules  # unless nobody says which symbols there are


THRESHOLDS = [
    # what the rule set says                                        from  unsuitable below  not assessed below
    ("", rules.Thresholds(0.5, 0.1, 0.2)),
    ("[thresholds]", rules.Thresholds(0.5, 0.1, 0.2)),
    ("[thresholds]\nunsuitable_from = 0.3", rules.Thresholds(0.3, 0.1, 0.2)),
    (
        "[thresholds]\nunsuitable_from = 1\nsuitable_p_unsuitable_below = 0.05\nsuitable_p_not_assessed_below = 1.0",
        rules.Thresholds(1.0, 0.05, 1.0),
    ),
]


@pytest.mark.parametrize(("text", "expected"), THRESHOLDS)
def test_a_rule_set_may_set_other_thresholds(text: str, expected: rules.Thresholds) -> None:
    assert rules.parse_rule_set(HEAD + text + REST, "test").thresholds == expected


def test_of_several_rule_sets_the_smallest_of_each_threshold_holds() -> None:
    one = rules.parse_rule_set(HEAD + "[thresholds]\nunsuitable_from = 0.3" + REST, "one")
    two = rules.parse_rule_set(HEAD + "[thresholds]\nsuitable_p_not_assessed_below = 0.05" + REST, "two")
    assert rules.strictest([one, two]) == rules.Thresholds(0.3, 0.1, 0.05)
    lax = rules.parse_rule_set(HEAD + "[thresholds]\nunsuitable_from = 0.9" + REST, "lax")
    assert rules.strictest([lax]) == rules.Thresholds(0.9, 0.1, 0.2)


def test_a_rule_set_made_for_fill_cannot_judge_the_ground_in_place(tmp_path: Path) -> None:
    folder = tmp_path
    (folder / "own.toml").write_text(HEAD.replace("in_place", "fill") + rule("True"))
    with pytest.raises(UsageError, match="applies_to = fill"):
        rules.read_rule_set("own.toml", folder)
    assert rules.read_rule_set("own.toml", folder, purpose="fill").applies_to == "fill"


def test_a_rule_set_that_is_not_there_is_refused_with_the_nearest_name(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match=r"found 'general_subgrad'.*did you mean general_subgrade\?"):
        rules.read_rule_set("general_subgrad")
    with pytest.raises(UsageError, match=r"none\.toml"):
        rules.read_rule_set("none.toml", tmp_path)


@pytest.mark.parametrize("name", rules.rule_set_names())
def test_every_rule_set_that_ships_can_be_read_and_names_its_source(name: str) -> None:
    rule_set = rules.read_rule_set(name, purpose=None, symbols=SYMBOLS)
    assert rule_set.source
    assert rule_set.edition
    assert rule_set.flag
    assert rule_set.rules
