"""Rule sets: dated, cited TOML files of criteria, and the judgment of soil by them.

A rule set lists its rules in order, and the first rule that is met decides. Where the data leave a rule unknown, its
result stays possible and the search goes on; the verdict stands if every possible answer is the same, and otherwise
it is ``not assessed``, with the missing columns named. A rule may say ``when_missing = "not_met"``, with a note that
tells why silence is no.
"""

from __future__ import annotations

import tomllib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from importlib import resources
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.errors import UsageError, problem
from geomap.ratings.conditions import Condition, ConditionError, condition_from_text

VERDICTS = ("suitable", "treat", "unsuitable", "not assessed")
SUITABLE, TREAT, UNSUITABLE, NOT_ASSESSED = range(4)
# Of several rule sets the worst verdict governs; "not assessed" is worse than treat, for it may hide a no.
WORST_FIRST = (UNSUITABLE, NOT_ASSESSED, TREAT, SUITABLE)

PURPOSES = ("in_place", "foundation", "fill", "reuse", "embedment")
_SET_KEYS = {"title", "source", "edition", "jurisdiction", "flag", "applies_to", "note", "rules"}
_RULE_KEYS = {"id", "clause", "when", "result", "rating", "when_missing", "note", "flag"}
_REQUIRED_SET = ("title", "source", "edition", "jurisdiction", "flag", "applies_to", "rules")
_REQUIRED_RULE = ("id", "clause", "when", "result")


@dataclass(frozen=True)
class Rule:
    """One criterion: when it is met, the soil gets `result`, and `rating` is the source's own word for it."""

    id: str
    clause: str
    condition: Condition
    result: str
    rating: str = ""
    silence_is_no: bool = False


@dataclass(frozen=True)
class RuleSet:
    """A named set of criteria with its origin."""

    name: str
    title: str
    source: str
    edition: str
    jurisdiction: str
    flag: str
    applies_to: str
    rules: tuple[Rule, ...]

    @property
    def columns(self) -> tuple[str, ...]:
        """Columns that the rules look at."""
        return tuple(dict.fromkeys(c for rule in self.rules for c in rule.condition.columns))

    def codes(self, table: Mapping[str, Any], rows: int) -> tuple[NDArray[np.int8], NDArray[np.int16]]:
        """Judge soils given as arrays.

        Parameters
        ----------
        table
            Columns by name, each of length `rows`; what is missing stays unknown.
        rows
            Number of soils.

        Returns
        -------
        verdict, rule
            Index into :data:`VERDICTS`, and index of the rule that decided or, for a soil that is not assessed,
            of the first one left unknown; -1 where no rule was met.
        """
        possible = np.zeros(rows, dtype=np.int8)  # one bit for each verdict
        met_by = np.full(rows, -1, dtype=np.int16)
        unknown_at = np.full(rows, -1, dtype=np.int16)
        is_open = np.ones(rows, dtype=bool)
        for number, rule in enumerate(self.rules):
            truth = rule.condition.judge(table, rows)
            met = is_open & truth.yes
            unknown = is_open & truth.unknown & (not rule.silence_is_no)
            possible[met | unknown] |= 1 << VERDICTS.index(rule.result)
            met_by[met] = number
            unknown_at[unknown & (unknown_at < 0)] = number
            is_open &= ~met
        possible[is_open] |= 1 << NOT_ASSESSED
        verdict = np.full(rows, NOT_ASSESSED, dtype=np.int8)
        for code in range(len(VERDICTS)):
            verdict[possible == 1 << code] = code
        return verdict, np.where((verdict == NOT_ASSESSED) & (unknown_at >= 0), unknown_at, met_by)


def rule_set_names() -> list[str]:
    """Return the names of the rule sets that come with geomap: the folder is the list."""
    folder = resources.files("geomap.ratings") / "rulesets"
    return sorted(f.name.removesuffix(".toml") for f in folder.iterdir() if f.name.endswith(".toml"))


def read_rule_set(name: str, folder: Path | None = None, purpose: str | None = "in_place") -> RuleSet:
    """Read a rule set by name, or a project's own from a file.

    Parameters
    ----------
    name
        A name of :func:`rule_set_names`, or a file name ending in ``.toml``.
    folder
        Where a file is looked for.
    purpose
        What it will be used for, one of :data:`PURPOSES`; None where it is only looked at.

    Raises
    ------
    UsageError
        The file is wrong (with rule and reason), or the set is made for another purpose.
    """
    if name.endswith(".toml"):
        try:
            text = ((folder or Path()) / name).read_text("utf-8")
        except (OSError, UnicodeDecodeError) as error:
            raise UsageError(problem(name, error, "a rule set in TOML", "check the file")) from None
    else:
        text = (resources.files("geomap.ratings") / "rulesets" / f"{name}.toml").read_text("utf-8")
    rule_set = parse_rule_set(text, name)
    if purpose is not None and rule_set.applies_to != purpose:
        raise UsageError(
            problem(
                f"rule set {name}", f"applies_to = {rule_set.applies_to}", purpose, "use a set made for this purpose"
            )
        )
    return rule_set


def parse_rule_set(text: str, name: str) -> RuleSet:
    """Read the text of a rule set; `name` is its name in messages and results.

    Raises
    ------
    UsageError
        With the rule, its line, what was found and what is allowed.
    """
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise UsageError(problem(name, error, "TOML text", "correct the line")) from None
    _check_keys(data, _SET_KEYS, _REQUIRED_SET, name)
    if data["applies_to"] not in PURPOSES:
        raise UsageError(problem(f"{name}: applies_to", data["applies_to"], ", ".join(PURPOSES), "choose one"))
    lines = [n for n, line in enumerate(text.splitlines(), 1) if line.strip().replace(" ", "") == "[[rules]]"]
    rules = tuple(_rule(entry, f"{name}:{line}") for entry, line in zip(data["rules"], lines, strict=False))
    about = {key: str(data[key]) for key in _REQUIRED_SET if key != "rules"}
    return RuleSet(name=name, **about, rules=rules)


def _check_keys(entry: Mapping[str, Any], known: set[str], required: Sequence[str], place: str) -> None:
    for key in entry:
        if key not in known:
            raise UsageError(problem(place, key, ", ".join(sorted(known)), "correct or delete the key"))
    for key in required:
        if key not in entry:
            raise UsageError(problem(place, f"no {key}", ", ".join(required), f"add {key}"))


def _rule(entry: Mapping[str, Any], place: str) -> Rule:
    _check_keys(entry, _RULE_KEYS, _REQUIRED_RULE, place)
    place = f"{place}: rule {entry['id']}"
    if entry["result"] not in VERDICTS:
        raise UsageError(problem(place, entry["result"], ", ".join(VERDICTS), "choose one"))
    if entry.get("when_missing", "unknown") not in ("unknown", "not_met"):
        raise UsageError(problem(place, entry["when_missing"], "unknown, not_met", "choose one"))
    try:
        condition = condition_from_text(entry["when"])
    except ConditionError as error:
        raise UsageError(problem(place, entry["when"], "a condition", str(error))) from None
    silence = entry.get("when_missing") == "not_met"
    return Rule(entry["id"], entry["clause"], condition, entry["result"], entry.get("rating", ""), silence)


def rate(soils: pd.DataFrame, rule_sets: Sequence[RuleSet]) -> pd.DataFrame:
    """Judge a table of soils by one or several rule sets; of several the worst verdict governs and is named.

    Parameters
    ----------
    soils
        Records with classes, one row for each soil.
    rule_sets
        At least one.

    Returns
    -------
    DataFrame
        Same index: ``suitability``, ``suitability_reason``, ``rule`` (set, rule and clause) and
        ``subgrade_rating`` (the source's own word), with ``verdict`` as the code.
    """
    table = {name: soils[name].to_numpy() for rule_set in rule_sets for name in rule_set.columns if name in soils}
    judged = [rule_set.codes(table, len(soils)) for rule_set in rule_sets]
    rank = np.empty(len(VERDICTS), dtype=int)
    rank[list(WORST_FIRST)] = range(len(VERDICTS))
    governs = np.argmin([rank[verdict] for verdict, _ in judged], axis=0)
    result = pd.DataFrame(index=soils.index)
    verdict = np.choose(governs, [v for v, _ in judged])
    words = [_words(s, v, r, table) for s, (v, r) in zip(rule_sets, judged, strict=True)]
    result["suitability"] = pd.Series(np.array(VERDICTS, dtype=object)[verdict], index=soils.index, dtype="string")
    for position, name in enumerate(("rule", "subgrade_rating", "suitability_reason")):
        texts = np.choose(governs, [w[position] for w in words])
        result[name] = pd.Series(texts, index=soils.index, dtype="string").replace("", pd.NA)
    result["verdict"] = verdict.astype(np.int8)
    return result


def _words(
    rule_set: RuleSet, verdict: NDArray[np.int8], decided_by: NDArray[np.int16], table: Mapping[str, Any]
) -> tuple[NDArray[Any], NDArray[Any], NDArray[Any]]:
    """Return for each soil the rule with its clause, the rating word, and why it is not assessed."""
    rules, ratings, missing = [f"{rule_set.name}: no rule is met"], [""], ["no rule of the set is met"]
    for rule in rule_set.rules:
        rules.append(f"{rule_set.name} {rule.id}: {rule.clause}")
        ratings.append(rule.rating)
        missing.append("needs " + ", ".join(rule.condition.columns))
    at = decided_by.astype(int) + 1
    reason = np.where(verdict == NOT_ASSESSED, np.array(missing, dtype=object)[at], "")
    rating = np.where(verdict == NOT_ASSESSED, "", np.array(ratings, dtype=object)[at])
    return np.array(rules, dtype=object)[at], rating, reason
