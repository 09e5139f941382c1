"""Rule sets: dated, cited TOML files of criteria, and the judgment of soil by them.

A rule set lists its rules in order, and the first rule that is met decides. Where the data leave a rule unknown, its
result stays possible and the search goes on; the verdict stands if every possible answer is the same, and otherwise
it is ``not assessed``, with the missing columns named. A rule may say ``when_missing = "not_met"``, with a note that
tells why silence is no.
"""

from __future__ import annotations

import re
import tomllib
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, fields
from importlib import resources
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.errors import UsageError, problem
from geomap.ratings.conditions import Condition, ConditionError, condition_from_text
from geomap.ratings.vocabulary import nearest

VERDICTS = ("suitable", "treat", "unsuitable", "not assessed")
SUITABLE, TREAT, UNSUITABLE, NOT_ASSESSED = range(4)
# Of several rule sets the worst verdict governs; "not assessed" is worse than treat, for it may hide a no.
WORST_FIRST = (UNSUITABLE, NOT_ASSESSED, TREAT, SUITABLE)

NO_RULE_MET = "not assessed, no rule is met"
PURPOSES = ("in_place", "foundation", "fill", "reuse", "embedment")
_SET_TEXTS = ("title", "source", "edition", "jurisdiction", "flag", "applies_to")
_RULE_TEXTS = ("id", "clause", "when", "result")
_SET_KEYS = (*_SET_TEXTS, "note", "thresholds", "rules")
_RULE_KEYS = (*_RULE_TEXTS, "rating", "when_missing", "note", "flag")


@dataclass(frozen=True)
class Rule:
    """One criterion: when it is met, the soil gets `result`, and `rating` is the source's own word for it."""

    id: str
    clause: str
    condition: Condition
    result: str
    rating: str = ""
    silence_is_no: bool = False
    note: str = ""
    flag: str = ""


@dataclass(frozen=True)
class Thresholds:
    """Probabilities that decide the suitability of a stretch; each greater than 0 and at most 1.

    Attributes
    ----------
    unsuitable_from
        The stretch is unsuitable if unsuitable soil is this probable or more.
    suitable_p_unsuitable_below, suitable_p_not_assessed_below
        It is suitable only if both are less probable than this.
    """

    unsuitable_from: float = 0.5
    suitable_p_unsuitable_below: float = 0.1
    suitable_p_not_assessed_below: float = 0.2


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
    thresholds: Thresholds = Thresholds()

    @property
    def columns(self) -> tuple[str, ...]:
        """Columns that the rules look at."""
        return tuple(dict.fromkeys(c for rule in self.rules for c in rule.condition.columns))

    def codes(self, table: Mapping[str, Any], rows: int) -> tuple[NDArray[np.int8], NDArray[np.int16]]:
        """Judge soils given as arrays.

        Parameters
        ----------
        table
            Columns by name, each of length `rows`, with the bounds of censored ones where there are any; what is
            missing stays unknown.
        rows
            Number of soils.

        Returns
        -------
        verdict, rule
            Index into :data:`VERDICTS`, and index of the rule that decided; -1 where none did: no rule is met, or
            one that is left unknown would have given another verdict.
        """
        met_by, unknown = self._search(table, rows)
        possible = self._possible(met_by, unknown)
        verdict = np.full(rows, NOT_ASSESSED, dtype=np.int8)
        for code in range(len(VERDICTS)):
            verdict[possible == 1 << code] = code
        is_split = (possible & (possible - 1)) != 0  # more than one bit
        return verdict, np.where(is_split, np.int16(-1), met_by)

    def needs(self, table: Mapping[str, Any], rows: int) -> NDArray[np.bool_]:
        """Return for each soil the columns whose absence keeps it from being assessed.

        Parameters
        ----------
        table, rows
            As for :meth:`codes`.

        Returns
        -------
        ndarray
            True where the column is missing and leaves a rule unknown, shape (rows, columns) in the order of
            :attr:`columns`; nothing for a soil whose verdict stands without it.
        """
        met_by, unknown = self._search(table, rows)
        possible = self._possible(met_by, unknown)
        is_split = (possible & (possible - 1)) != 0
        at = {name: k for k, name in enumerate(self.columns)}
        missing = np.zeros((rows, len(at)), dtype=bool)
        for rule, left in zip(self.rules, unknown & is_split, strict=True):
            if left.any():
                for name, gap in rule.condition.gaps(table, rows):
                    missing[:, at[name]] |= gap & left
        return missing

    def _search(self, table: Mapping[str, Any], rows: int) -> tuple[NDArray[np.int16], NDArray[np.bool_]]:
        """Return the first rule met, -1 for none, and the rules left unknown before it, shape (rules, rows)."""
        met_by = np.full(rows, -1, dtype=np.int16)
        unknown = np.zeros((len(self.rules), rows), dtype=bool)
        for number, rule in enumerate(self.rules):
            truth = rule.condition.judge(table, rows)
            is_open = met_by < 0
            unknown[number] = is_open & truth.unknown & (not rule.silence_is_no)
            met_by[is_open & truth.yes] = number
        return met_by, unknown

    def _possible(self, met_by: NDArray[np.int16], unknown: NDArray[np.bool_]) -> NDArray[np.int8]:
        """Return the verdicts that the data leave possible, one bit for each."""
        bits = np.array([1 << VERDICTS.index(rule.result) for rule in self.rules] + [1 << NOT_ASSESSED], dtype=np.int8)
        possible = bits[met_by]  # -1 takes the last: no rule is met
        for bit, left in zip(bits[:-1], unknown, strict=True):
            possible[left] |= bit
        return possible


def strictest(rule_sets: Sequence[RuleSet]) -> Thresholds:
    """Return the smallest of each threshold; the defaults where there is no rule set.

    Examples
    --------
    >>> strictest([])
    Thresholds(unsuitable_from=0.5, suitable_p_unsuitable_below=0.1, suitable_p_not_assessed_below=0.2)
    """
    given = [rule_set.thresholds for rule_set in rule_sets] or [Thresholds()]
    return Thresholds(**{f.name: min(getattr(t, f.name) for t in given) for f in fields(Thresholds)})


def rule_set_names() -> list[str]:
    """Return the names of the rule sets that come with geomap: the folder is the list."""
    folder = resources.files("geomap.ratings") / "rulesets"
    return sorted(f.name.removesuffix(".toml") for f in folder.iterdir() if f.name.endswith(".toml"))


def read_rule_set(
    name: str,
    folder: Path | None = None,
    purpose: str | None = "in_place",
    symbols: Mapping[str, Collection[str]] | None = None,
) -> RuleSet:
    """Read a rule set by name, or a project's own from a file.

    Parameters
    ----------
    name
        A name of :func:`rule_set_names`, or a file name ending in ``.toml``.
    folder
        Where a file is looked for.
    purpose
        What it will be used for, one of :data:`PURPOSES`; None where it is only looked at.
    symbols
        As for :func:`parse_rule_set`.

    Raises
    ------
    UsageError
        There is no such set, the file is wrong (with rule and reason), or the set is made for another purpose.
    """
    if name.endswith(".toml"):
        try:
            text = ((folder or Path()) / name).read_text("utf-8-sig")
        except (OSError, UnicodeDecodeError) as error:
            raise UsageError(problem(name, error, "a rule set in TOML", "check the file")) from None
    elif name in rule_set_names():
        text = (resources.files("geomap.ratings") / "rulesets" / f"{name}.toml").read_text("utf-8")
    else:
        raise UsageError(_not_one_of("rule set", name, rule_set_names()))
    rule_set = parse_rule_set(text, name, symbols)
    if purpose is not None and rule_set.applies_to != purpose:
        raise UsageError(
            problem(
                f"rule set {name}", f"applies_to = {rule_set.applies_to}", purpose, "use a set made for this purpose"
            )
        )
    return rule_set


def parse_rule_set(text: str, name: str, symbols: Mapping[str, Collection[str]] | None = None) -> RuleSet:
    """Read the text of a rule set; `name` is its name in messages and results.

    Parameters
    ----------
    text
        TOML.
    name
        Name in messages and results.
    symbols
        For columns of classes (``uscs_symbol``), the only texts that they can hold; a condition with another text is
        refused. A column that is not there takes any text.

    Raises
    ------
    UsageError
        With the rule, its line, what was found and what is allowed.
    """
    try:
        data = tomllib.loads(text)
    except tomllib.TOMLDecodeError as error:
        raise UsageError(problem(name, error, "TOML text", "correct the line")) from None
    _check_keys(data, _SET_KEYS, (*_SET_TEXTS, "rules"), name)
    about = {key: _text(data, key, name) for key in _SET_TEXTS}
    _text(data, "note", name)
    if about["applies_to"] not in PURPOSES:
        raise UsageError(_not_one_of(f"{name}: applies_to", about["applies_to"], PURPOSES))
    rules: dict[str, Rule] = {}
    for number, entry in enumerate(_entries(data["rules"], name), 1):
        place = _place(text, name, entry, number)
        rule = _rule(entry, place, symbols)
        if rule.id in rules:
            raise UsageError(
                problem(f"{name}: rule number {number}", rule.id, "an id of its own", "rename one of them")
            )
        rules[rule.id] = rule
    return RuleSet(**about, name=name, rules=tuple(rules.values()), thresholds=_thresholds(data, name))


def _not_one_of(place: str, found: str, choices: Collection[str]) -> str:
    near = nearest(found, choices)
    return problem(place, found, ", ".join(choices), f"did you mean {near}?" if near else "choose one")


def _check_keys(entry: Mapping[str, Any], known: Sequence[str], required: Sequence[str], place: str) -> None:
    for key in entry:
        if key not in known:
            raise UsageError(_not_one_of(place, key, known))
    for key in required:
        if key not in entry:
            raise UsageError(problem(place, f"no {key}", ", ".join(required), f"add {key}"))


def _text(entry: Mapping[str, Any], key: str, place: str) -> str:
    """Return a text that must not be blank; a key that is not there is a blank."""
    value = entry.get(key, "")
    if not isinstance(value, str):
        raise UsageError(problem(f"{place}: {key}", value, "a text", "put it in quotation marks"))
    if key in entry and not value.strip():
        raise UsageError(problem(f"{place}: {key}", value, "a text", "fill it in"))
    return value


def _entries(rules: object, name: str) -> list[dict[str, Any]]:
    if not isinstance(rules, list) or not rules or not all(isinstance(entry, dict) for entry in rules):
        raise UsageError(problem(f"{name}: rules", rules, "one table or more", "write each rule below [[rules]]"))
    return rules


def _place(text: str, name: str, entry: Mapping[str, Any], number: int) -> str:
    """Return where a rule stands: its line where its id can be found in the text, and otherwise its number."""
    word = entry.get("id")
    if not isinstance(word, str) or not word.strip():
        return f"{name}: rule number {number}"
    found = re.search(rf"""\bid["']?\s*=\s*["']+{re.escape(word)}["']""", text)
    line = f":{text.count(chr(10), 0, found.start()) + 1}" if found else ""
    return f"{name}{line}: rule {word}"


def _rule(entry: Mapping[str, Any], place: str, symbols: Mapping[str, Collection[str]] | None) -> Rule:
    _check_keys(entry, _RULE_KEYS, _RULE_TEXTS, place)
    texts = {key: _text(entry, key, place) for key in _RULE_KEYS}
    if texts["result"] not in VERDICTS:
        raise UsageError(_not_one_of(f"{place}: result", texts["result"], VERDICTS))
    silence = texts.pop("when_missing") or "unknown"
    if silence not in ("unknown", "not_met"):
        raise UsageError(_not_one_of(f"{place}: when_missing", silence, ("unknown", "not_met")))
    when = texts.pop("when")
    try:
        condition = condition_from_text(when, symbols)
    except ConditionError as error:
        raise UsageError(problem(f"{place}: when", when, "a condition", str(error))) from None
    return Rule(condition=condition, silence_is_no=silence == "not_met", **texts)


def _thresholds(data: Mapping[str, Any], name: str) -> Thresholds:
    given, place = data.get("thresholds", {}), f"{name}: thresholds"
    if not isinstance(given, dict):
        raise UsageError(problem(place, given, "a table", "write the keys below [thresholds]"))
    _check_keys(given, [f.name for f in fields(Thresholds)], (), place)
    for key, value in given.items():
        if isinstance(value, bool) or not isinstance(value, int | float) or not 0 < value <= 1:
            raise UsageError(problem(f"{place}: {key}", value, "a number greater than 0, at most 1", "correct it"))
    return Thresholds(**{key: float(value) for key, value in given.items()})


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
        Same index: ``suitability``, ``suitability_reason`` (why a soil is not assessed), ``rule`` (set, rule and
        clause that decided; never a rule that was not met) and ``subgrade_rating`` (the source's own word), with
        ``verdict`` as the code.
    """
    asked = {end for rule_set in rule_sets for name in rule_set.columns for end in (name, f"{name}_bound")}
    table = {name: soils[name].to_numpy() for name in asked.intersection(soils.columns)}
    judged = [rule_set.codes(table, len(soils)) for rule_set in rule_sets]
    rank = np.empty(len(VERDICTS), dtype=int)
    rank[list(WORST_FIRST)] = range(len(VERDICTS))
    governs = np.argmin([rank[verdict] for verdict, _ in judged], axis=0)
    result = pd.DataFrame(index=soils.index)
    verdict = np.choose(governs, [v for v, _ in judged])
    words = [_words(s, v, r, table) for s, (v, r) in zip(rule_sets, judged, strict=True)]
    result["suitability"] = pd.Series(np.array(VERDICTS, dtype=object)[verdict], index=soils.index, dtype="string")
    for position, name in enumerate(("suitability_reason", "rule", "subgrade_rating")):
        texts = np.choose(governs, [w[position] for w in words])
        result[name] = pd.Series(texts, index=soils.index, dtype="string").replace("", pd.NA)
    result["verdict"] = verdict.astype(np.int8)
    return result


def _words(
    rule_set: RuleSet, verdict: NDArray[np.int8], decided_by: NDArray[np.int16], table: Mapping[str, Any]
) -> tuple[NDArray[np.object_], NDArray[np.object_], NDArray[np.object_]]:
    """Return for each soil why it is not assessed, the rule with its clause, and the rating word."""
    rules = rule_set.rules
    by_rule = np.array([f"{rule.id}: {rule.clause}" for rule in rules] + [""], dtype=object)[decided_by]
    rating = np.array([rule.rating for rule in rules] + [""], dtype=object)[decided_by]
    is_met = decided_by >= 0
    reason = np.where(is_met & (verdict != NOT_ASSESSED), "", by_rule)
    reason[~is_met] = _not_assessed(
        rule_set, {name: values[~is_met] for name, values in table.items()}, (~is_met).sum()
    )
    rule = np.where(is_met, f"{rule_set.name} " + by_rule, f"{rule_set.name}: " + reason)
    return reason, rule, rating


def _not_assessed(rule_set: RuleSet, table: Mapping[str, Any], rows: int) -> NDArray[np.object_]:
    """Return for soils that no rule decided what each of them needs."""
    columns = np.array(rule_set.columns, dtype=object)
    if not len(columns):
        return np.full(rows, NO_RULE_MET, dtype=object)
    patterns, which = np.unique(rule_set.needs(table, rows), axis=0, return_inverse=True)
    texts = [f"not assessed, needs {', '.join(columns[p])}" if p.any() else NO_RULE_MET for p in patterns]
    return np.array(texts, dtype=object)[which.reshape(-1)]
