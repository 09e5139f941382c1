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

NAN = np.nan


def soils(rows: list[dict[str, object]]) -> pd.DataFrame:
    table = pd.DataFrame(rows)
    for name in ("uscs_symbol", "aashto_group", "origin"):
        table[name] = pd.Series(table.get(name), index=table.index, dtype="string")
    for name in ("liquid_limit_pct", "plasticity_index_pct", "organic_pct"):
        table[name] = pd.Series(table.get(name, NAN), index=table.index, dtype="float64")
    table["is_nonplastic"] = pd.Series(table.get("is_nonplastic"), index=table.index, dtype="boolean")
    return table


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
    ({"uscs_symbol": "OL"}, "unsuitable", "poor to very poor"),
    ({"uscs_symbol": "OH"}, "unsuitable", "poor to very poor"),
    ({"uscs_symbol": "PT"}, "unsuitable", "not suitable"),
    # a dual symbol takes the poorer of its parents
    ({"uscs_symbol": "GP-GC"}, "suitable", "good"),
    ({"uscs_symbol": "SP-SM"}, "suitable", "fair"),
    ({"uscs_symbol": "SC-SM"}, "suitable", "poor to fair"),
    ({"uscs_symbol": "CL-ML"}, "suitable", "poor to fair"),
    # origin and organic matter go before the group
    ({"uscs_symbol": "CL", "origin": "topsoil"}, "unsuitable", None),
    ({"uscs_symbol": "GW", "origin": "made ground"}, "treat", None),
    ({"uscs_symbol": "CL", "organic_pct": 5.0}, "suitable", "poor to fair"),
    ({"uscs_symbol": "CL", "organic_pct": 5.1}, "unsuitable", None),
    ({"aashto_group": "A-8"}, "unsuitable", "not suitable"),
]


@pytest.mark.parametrize(("soil", "verdict", "word"), GENERAL, ids=[str(s) for s, _, _ in GENERAL])
def test_general_subgrade(soil: dict[str, object], verdict: str, word: str | None) -> None:
    row = rules.rate(soils([soil]), [rules.read_rule_set("general_subgrade")]).iloc[0]
    assert row["suitability"] == verdict
    assert (None if pd.isna(row["subgrade_rating"]) else row["subgrade_rating"]) == word
    assert row["rule"].startswith("general_subgrade ")


def test_a_soil_without_symbol_is_not_assessed_and_says_what_it_needs() -> None:
    row = rules.rate(soils([{"liquid_limit_pct": 30}]), [rules.read_rule_set("general_subgrade")]).iloc[0]
    assert row["suitability"] == "not assessed"
    assert row["suitability_reason"] == "needs uscs_symbol"


def test_silty_sand_without_limits_is_suitable_since_both_rows_of_the_table_are() -> None:
    row = rules.rate(soils([{"uscs_symbol": "SM"}]), [rules.read_rule_set("general_subgrade")]).iloc[0]
    assert (row["suitability"], row["subgrade_rating"]) == ("suitable", "fair")  # the poorer word


HEAD = """
title = "Test set"
source = "constructed for this test"
edition = "1"
jurisdiction = "none"
flag = "constructed"
applies_to = "in_place"
"""


def rule(when: str, result: str = "unsuitable", more: str = "") -> str:
    return f"\n[[rules]]\nid = 'r'\nclause = 'c'\nwhen = '''{when}'''\nresult = '{result}'\n{more}\n"


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
    rule_set = rules.parse_rule_set(HEAD + rule(when) + rule("True", "suitable"), "test")
    table = soils([{"liquid_limit_pct": limit, "plasticity_index_pct": index}])
    assert rules.rate(table, [rule_set])["suitability"].tolist() == [verdict]


def test_a_rule_may_say_that_silence_is_no() -> None:
    text = HEAD + rule("organic_pct > 5", more='when_missing = "not_met"') + rule("True", "suitable")
    table = soils([{"organic_pct": NAN}, {"organic_pct": 6}])
    assert rules.rate(table, [rules.parse_rule_set(text, "test")])["suitability"].tolist() == ["suitable", "unsuitable"]


def test_of_several_rule_sets_the_worst_governs_and_is_named() -> None:
    mild = rules.parse_rule_set(HEAD + rule("True", "treat"), "mild")
    strict = rules.parse_rule_set(HEAD + rule("liquid_limit_pct > 50") + rule("True", "suitable"), "strict")
    rated = rules.rate(soils([{"liquid_limit_pct": 60}, {"liquid_limit_pct": 30}]), [mild, strict])
    assert rated["suitability"].tolist() == ["unsuitable", "treat"]
    assert [r.split()[0] for r in rated["rule"]] == ["strict", "mild"]


BAD = [
    (HEAD + rule("liquid_limit > 50"), "there is no column 'liquid_limit'"),
    (HEAD + rule("liquid_limit_pct >"), "cannot be read"),
    (HEAD + rule("liquid_limit_pct > 'CH'"), "is compared with 0 to 500"),
    (HEAD + rule("uscs_symbol > 3"), "is compared with text"),
    (HEAD + rule("__import__('os').system('x')"), "is not a comparison"),
    (HEAD + rule("1 < liquid_limit_pct < 2"), "is not a comparison"),
    (HEAD + rule("True", "bad"), "allowed: suitable, treat, unsuitable, not assessed"),
    (HEAD.replace("in_place", "roads") + rule("True"), "allowed: in_place"),
    (HEAD + rule("True", more="because = 'x'"), "found 'because'"),
    (HEAD.replace('edition = "1"', "") + rule("True"), "no edition"),
    ("title = ", "TOML"),
]


@pytest.mark.parametrize(("text", "message"), BAD)
def test_a_bad_rule_file_is_refused_with_the_reason(text: str, message: str) -> None:
    with pytest.raises(UsageError, match=r".") as caught:
        rules.parse_rule_set(text, "own.toml")
    assert message in str(caught.value)
    assert "own.toml" in str(caught.value)


def test_a_rule_set_made_for_fill_cannot_judge_the_ground_in_place(tmp_path: Path) -> None:
    folder = tmp_path
    (folder / "own.toml").write_text(HEAD.replace("in_place", "fill") + rule("True"))
    with pytest.raises(UsageError, match="applies_to = fill"):
        rules.read_rule_set("own.toml", folder)
    assert rules.read_rule_set("own.toml", folder, purpose="fill").applies_to == "fill"


def test_every_rule_set_that_ships_can_be_read_and_names_its_source() -> None:
    for name in rules.rule_set_names():
        rule_set = rules.read_rule_set(name, purpose=None)
        assert rule_set.source
        assert rule_set.edition
        assert rule_set.flag
        assert rule_set.rules
