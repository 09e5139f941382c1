"""Intake of agreement: the laboratory group against what the field crew saw, and against the test results.

Called once the samples are classified. Both opinions are kept; each difference is a question.
"""

from __future__ import annotations

import functools
import tomllib
from collections.abc import Mapping
from importlib import resources
from itertools import product

import numpy as np
import pandas as pd

from geomap.intake import groups, strata
from geomap.intake.entries import Entries, Flags, Intake
from geomap.tables.findings import Check

FIELD_GROUP = Check(
    "laboratory group against field group",
    "query",
    "a field group the same as the laboratory group, or next to it",
    "both are kept and the laboratory group governs; see whether the sample and the log belong together",
)
LAYER_GROUP = Check(
    "laboratory group against the layer",
    "query",
    "a field group of the layer the same as the laboratory group, or next to it",
    "both are kept and the laboratory group governs; see whether the sample lies in that layer",
)
DESCRIPTION = Check(
    "laboratory group against description",
    "query",
    "a description that fits the laboratory group or one next to it",
    "both are kept and the laboratory group governs; see whether the sample and the log belong together",
)
ORGANIC = Check(
    "organic by description, not tested",
    "query",
    "an organic content or an oven-dried liquid limit",
    "classified as not organic; ask the laboratory for a test of organic matter",
)
PLASTIC_SAND = Check(
    "plasticity without fine soil",
    "query",
    "soil finer than 0.425 mm to run the limits on",
    "used as it is; check the curve and the limits, they may be of two samples",
)
NONPLASTIC_FINES = Check(
    "NP with fines and a high liquid limit",
    "query",
    "NP in soils with few fines or a low liquid limit",
    "used as non-plastic; check the limits against the lab sheet",
)
HARDLY_ANY_PCT = 2.0  # passing 0.425 mm too little to run limits on; common practice, no source
MOSTLY_FINES_PCT = 90.0  # reference for NP against fines; common practice, no source
HIGH_LIQUID_LIMIT = 50.0  # LL of 50 parts low from high (ASTM D2487)

_NOUNS = "gravel|sand|silt|clay|peat"
_ASIDE = r"\b(?:with|traces? of|trace|some|little|few|occasional|containing|including)\b[^.;:]*"
_AFTER_SYMBOL = r"(?s)^([^:;]*\([A-Z]{2}(?:[-/][A-Z]{2})?\)):.*"  # "Lean clay (CL): 90 % fines, 10 % sand"
_ORGANIC_SOIL = r"(?i)\borganic soil\b"  # the group name of OL and OH in ASTM D2488, from memory
_STREAK = rf"\b(?:{_NOUNS})y?\s+(?:lens|lenses|seams?|layers?|partings?|pockets?|bands?|laminae|lumps?)\b"
_MAIN = r"^(?P<before>.*?)\b(?P<noun>{nouns})s?\b(?:\s*(?:/|&|and|or)\s*(?P<second>{nouns})s?\b)?"
_CLEAN = frozenset({"GW", "GP", "SW", "SP"})  # up to 12 % fines (ASTM D2487)
_FINE = frozenset({"ML", "CL", "MH", "CH", "OL", "OH", "PT"})  # 50 % fines or more, or peat (ASTM D2487)


def check(intake: Intake, classified: pd.DataFrame, records: pd.DataFrame) -> Intake:
    """Ask where laboratory and field, or group and test results, do not go together.

    Parameters
    ----------
    intake
        Tables after the intake of places.
    classified
        For each used sample, on the index of ``intake.used("samples")``: ``uscs_symbol``, ``uscs_symbol_basis``.
    records
        On the same index: ``passing_0_425_mm_pct``, ``fines_pct``, ``liquid_limit_pct``, ``plasticity_index_pct``,
        ``is_nonplastic`` as derived for the specimen.
    """
    samples = intake["samples"]
    every = samples.rows.index
    symbol = classified["uscs_symbol"].astype("string").where(classified["uscs_symbol_basis"] == "lab").reindex(every)
    field = samples.rows["visual_group"].str.strip()
    field = field.where(groups.kinds(field) != groups.NO_SYMBOL)  # such a word is used as no group
    parts = [
        *_field(samples, symbol, field),
        *_layer(intake, symbol.where(field.isna())),
        *_tests(samples, records.reindex(every)),
    ]
    return intake.having(samples, *parts)


def _field(samples: Entries, symbol: pd.Series, field: pd.Series) -> list[pd.DataFrame]:
    by_group = samples.used & _disagree(symbol, field)
    main = main_soil(samples.rows["description"])
    by_words = samples.used & ~by_group & _disagree(symbol, main)
    organic = main.str.contains("organic|peat").fillna(False).to_numpy(dtype=bool)
    mineral = symbol.notna() & ~symbol.str.contains("O|PT", regex=True).fillna(False)
    no_test = samples.missing("organic_pct") & samples.missing("liquid_limit_oven_dried_pct")
    untested = samples.used & organic & mineral.to_numpy(dtype=bool) & no_test & ~by_words
    lab = ("; laboratory group " + symbol.fillna("")).to_numpy(object)
    return [
        samples.findings_of(FIELD_GROUP, by_group, "visual_group", found=samples.found("visual_group") + lab),
        samples.findings_of(DESCRIPTION, by_words, "description", found=samples.found("description") + lab),
        samples.findings_of(ORGANIC, untested, "description", found=samples.found("description") + lab),
    ]


def _layer(intake: Intake, symbol: pd.Series) -> list[pd.DataFrame]:
    """Compare with the layer the samples that have no field group of their own."""
    if "strata" not in intake:
        return []
    samples, logged = intake["samples"], intake["strata"]
    layer = strata.holding(intake)
    group = strata.of_layer(logged, layer, "visual_group").set_axis(symbol.index)
    apart = samples.used & _disagree(symbol, group.where(groups.kinds(group) != groups.NO_SYMBOL))
    found = strata.beside(samples, logged, layer, apart, "visual_group") + "; laboratory group "
    found = found + symbol.fillna("").to_numpy(object)
    return [samples.findings_of(LAYER_GROUP, apart, "visual_group", found=found)]


def _tests(samples: Entries, records: pd.DataFrame) -> list[pd.DataFrame]:
    number = {
        name: records[name].to_numpy(dtype=float, na_value=np.nan)
        for name in ("passing_0_425_mm_pct", "fines_pct", "liquid_limit_pct", "plasticity_index_pct")
    }
    is_nonplastic = records["is_nonplastic"].astype("boolean").fillna(False).to_numpy(dtype=bool)
    plastic = (number["plasticity_index_pct"] > 0) & (number["passing_0_425_mm_pct"] <= HARDLY_ANY_PCT)
    fine = is_nonplastic & (number["fines_pct"] > MOSTLY_FINES_PCT) & (number["liquid_limit_pct"] >= HIGH_LIQUID_LIMIT)
    limits = ("liquid_limit_pct", "plastic_limit_pct", "plasticity_index_pct")
    passing = pd.Series(number["passing_0_425_mm_pct"]).map("; {:g} % passes 0.425 mm".format).to_numpy(object)
    fines = pd.Series(number["fines_pct"]).map("; {:g} % fines".format).to_numpy(object)
    return [
        samples.findings_of(PLASTIC_SAND, samples.used & plastic, *limits, found=samples.found(*limits) + passing),
        samples.findings_of(NONPLASTIC_FINES, samples.used & fine, *limits, found=samples.found(*limits) + fines),
    ]


def main_soil(descriptions: pd.Series) -> pd.Series:
    """Return what each description calls the soil: qualifier and main noun; two nouns joined by ``and`` both count.

    Parts after with, some, trace and the like are not the main soil. A noun in capitals, as on many logs, is
    preferred to others. Of a group name with its symbol, what follows the colon is left out.

    Examples
    --------
    >>> texts = ["Brown clayey fine SAND with gravel", "Firm grey silty CLAY", "sand and gravel", "Topsoil", None]
    >>> main_soil(pd.Series(texts, dtype="string")).tolist()
    ['clayey sand', 'silty clay', 'sand/gravel', <NA>, <NA>]
    >>> main_soil(pd.Series(["Organic soil (OH): 95 % fines, 5 % sand"], dtype="string")).tolist()
    ['organic clay']
    """
    codes, uniques = pd.factorize(descriptions)
    texts = pd.Series(uniques, dtype=object).str.replace(_AFTER_SYMBOL, r"\1", regex=True)
    texts = texts.str.replace(_ORGANIC_SOIL, "organic clay", regex=True)
    texts = texts.str.replace(rf"(?i){_ASIDE}|{_STREAK}", " ", regex=True)
    found = texts.str.lower().str.extract(_MAIN.format(nouns=_NOUNS))
    capitals = texts.str.extract(f"(?s){_MAIN.format(nouns=_NOUNS.upper()).replace('s?', 'S?')}")
    mixed = (texts != texts.str.upper()) & capitals["noun"].notna()
    found = capitals.apply(lambda part: part.str.lower()).where(mixed, found)
    clause = found["before"].fillna("").str.replace(r"^.*[.;:]", "", regex=True)
    silty = clause.str.extract(r"\b(silty|clayey)\b(?!.*\b(?:silty|clayey)\b)")[0]
    qualifier = silty.mask(clause.str.contains(r"(?<!non-)\b(?:organic|peaty|humic)\b", regex=True), "organic")
    second = ("/" + found["second"]).fillna("")
    words = (qualifier + " ").fillna("") + found["noun"] + second
    every = pd.concat([words, pd.Series([None], dtype=object)], ignore_index=True)
    taken = every.take(np.where(codes < 0, len(every) - 1, codes)).set_axis(descriptions.index)
    return pd.Series(taken.where(taken.notna(), None), dtype="string")


@functools.cache
def vocabulary() -> tuple[frozenset[frozenset[str]], Mapping[str, frozenset[str]]]:
    """Return the pairs of neighboring groups, and the groups that each main soil stands for, of ``agreement.toml``."""
    table = tomllib.loads((resources.files("geomap.intake") / "agreement.toml").read_text("utf-8"))
    neighbors = frozenset(frozenset(pair) for pair in table["neighbors"])
    soils = {
        f"{qualifier} {noun}".strip(): frozenset(groups)
        for noun, by_qualifier in table["descriptions"].items()
        for qualifier, groups in by_qualifier.items()
    }
    return neighbors, soils


def agree(laboratory: str, field: str) -> bool:
    """Return whether a laboratory group and a field group or main soil go together.

    A field word that is neither a group nor a soil goes with everything: there is nothing to compare.

    Examples
    --------
    >>> agree("CL", "CL-ML"), agree("SM", "ML"), agree("SM", "clay"), agree("SC", "clay"), agree("CL", "Boulders")
    (True, True, False, True, True)
    """
    neighbors, _ = vocabulary()
    ours, theirs = _groups(laboratory), _groups(field)
    if not ours or not theirs:
        return True
    for a, b in product(ours, theirs):
        # A soil with 5 to 12 % fines is no neighbor of a fine soil, whatever the kind of its fines.
        far = (ours & _CLEAN and b in _FINE) or (theirs & _CLEAN and a in _FINE)
        if a == b or (frozenset((a, b)) in neighbors and not far):
            return True
    return False


@functools.cache
def _groups(words: str) -> frozenset[str]:
    """Return the groups that a symbol (``SP-SM``, ``CL/CH``) or a main soil (``silty sand/gravel``) stands for."""
    neighbors, soils = vocabulary()
    known = frozenset().union(*neighbors)
    symbols = frozenset(words.upper().replace("/", "-").split("-")) & known
    if symbols:
        return symbols
    qualifier = words.split(" ", maxsplit=1)[0] + " " if " " in words else ""
    nouns = [noun if " " in noun else qualifier + noun for noun in words.split("/")]
    return frozenset().union(*(soils.get(noun, frozenset()) for noun in nouns))


def _disagree(symbol: pd.Series, field: pd.Series) -> Flags:
    """Return True where both are known and do not go together; each different pair is judged once."""
    pairs = (symbol.astype("string") + "\n" + field.astype("string")).dropna()
    number, unique = pd.factorize(pairs)
    apart = np.array([not agree(*str(pair).split("\n", maxsplit=1)) for pair in unique], dtype=bool)
    return pd.Series(apart[number], pairs.index).reindex(symbol.index, fill_value=False).to_numpy(dtype=bool)
