"""What to say about headings that no column answers to: a note for all, a warning where one looks like a soil test."""

from __future__ import annotations

import difflib
import json
import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import replace
from functools import cache
from types import MappingProxyType

import pandas as pd

from geomap.readers.heading_messages import listed
from geomap.readers.heading_rows import FINES_COLUMN
from geomap.readers.headings import Reading, reading, spellings
from geomap.readers.sheets import Place
from geomap.readers.spelling import is_unit, plain
from geomap.tables import schema
from geomap.tables.findings import Check, together
from geomap.tables.raw import Heading
from geomap.tables.schema import Layout

SAME_WORD = 0.8  # ours: likeness by difflib from which two words of some length are one word spelled twice
SAME_KEY = 0.88  # ours: the same for whole headings whose words are run together or apart
SHORT_WORD = 3  # words up to this length are the same only if equal
SHORT_KEY = 8

MAPPED_SECTIONS = ("borings", "samples", "gradations", "strata")  # tables that the corridor file calls as the layout

# Words that a heading of a soil test holds, whole or as its beginning.
TEST_WORDS = frozenset(
    (
        "ll",
        "pl",
        "pi",
        "wl",
        "wp",
        "ip",
        "cbr",
        "mdd",
        "omc",
        "nmc",
        "spt",
        "ph",
        "cu",
        "cc",
        "d10",
        "d30",
        "d60",
        "loi",
    )
)
TEST_STEMS = (
    *("liquid", "plastic", "atterberg", "swell", "moisture", "organic", "proctor", "compaction", "unconfined"),
    *("sulfat", "sulphat", "resistiv", "chlorid", "passing", "finer", "sieve", "gradation", "grading", "hydrometer"),
)
SIZE_WORDS = frozenset(("passing", "finer", "sieve", "gradation", "grading", "hydrometer"))
# Words that say that a heading is about a test and holds no result of it.
ABOUT_WORDS = frozenset(
    (
        "date",
        "day",
        "time",
        "by",
        "method",
        "standard",
        "remark",
        "remarks",
        "note",
        "notes",
        "no",
        "number",
        "ref",
        "id",
    )
)
FRACTIONS = frozenset(("gravel", "sand", "silt", "clay", "fines"))
# What may stand beside a fraction of soil in a heading of its percentage.
FRACTION_WORDS = FRACTIONS | {
    *("%", "pct", "percent", "percentage", "content", "fraction", "total", "coarse", "medium", "fine"),
    *("and", "by", "of", "dry", "mass", "weight"),
}
SYMBOL_WORDS = frozenset(("uscs", "unified"))

_WORD = re.compile(r"[^\W_]+|%")
_KNOWN = "a heading that geomap knows"

NOT_READ = Check("headings not read", "accept", _KNOWN, "not read; kept in the file only")
NEAR = Check("heading not read, near a known one", "query", _KNOWN, "not read")
TEST = Check("heading of a soil test not read", "query", _KNOWN, "not read")
RETAINED = Check(
    "percent retained",
    "query",
    "percent passing",
    "percent retained is not read; give percent passing: 100 less all that is retained on this and coarser sieves",
)
FRACTION = Check(
    "soil fraction not read",
    "query",
    "percent passing a sieve",
    "not read, because the size limits of this fraction differ between standards; give percent passing by sieve",
)
SYMBOL = Check("soil group not read", "query", "visual_group for a group from the field", "not read")
NO_TEST = Check(
    "no soil test",
    "query",
    "a column of soil tests or visual_group",
    "nothing can be classified from this table, unless gradations in a table of their own belong to it; "
    "see which headings were not read",
)


def about_unread(
    unread: Sequence[str], taken: Mapping[str, Heading], layout: Layout, place: Place, given: Collection[str] = ()
) -> pd.DataFrame:
    """Return findings about headings that were not read, and about a table of samples without any soil test.

    Parameters
    ----------
    unread
        Headings that no column answers to and about which nothing was said yet.
    taken
        Headings that were read, by column.
    layout
        Which table it is.
    place
        File and sheet, or row.
    given
        Columns that come from elsewhere than a heading.
    """
    parts, listed_only = [], []
    for label in unread:
        found = reading(label, layout)
        if isinstance(found, Reading) and found.column in given:
            continue
        check = None if isinstance(found, Reading) else _check(label, layout, {*taken, *given})
        if check is None:
            listed_only.append(label)
        else:
            parts.append(check.row(label, " ".join(label.split()), **place.columns))
    if listed_only:
        parts.insert(0, NOT_READ.row("", listed(listed_only), **place.columns))
    if layout.takes_passing and not any(_is_test(name) for name in taken):
        parts.append(NO_TEST.row("", listed([heading.found for heading in taken.values()]), **place.columns))
    return together(parts)


def _is_test(name: str) -> bool:
    column = schema.column(name)
    return name == "visual_group" or (column.type in ("number", "integer", "flag") and "depth" not in name)


def _check(label: str, layout: Layout, taken: Collection[str]) -> Check | None:
    """Return what is to be said about one heading, or None where nothing is worth more than the note."""
    words = _WORD.findall(plain(label))
    if plain(label) in schema.layers()["samples"].columns or not words:  # written by geomap itself
        return None
    if layout.takes_passing and any(word.startswith("retain") for word in words):
        return RETAINED
    if layout.takes_passing and FRACTIONS & set(words) and set(words) <= FRACTION_WORDS:
        return _fraction(label, words, layout, taken)
    if "visual_group" in layout.columns and SYMBOL_WORDS & set(words):
        advice = f"not read; if it is from the field: {_remedy(label, 'visual_group', layout)}"
        return None if "visual_group" in taken else replace(SYMBOL, advice=advice)
    free = {name: column for name, column in _names(layout.name).items() if column not in taken}
    column = _near(_bare(words), free)
    if column:
        return replace(NEAR, advice=_advice(label, column, layout))
    return _test(label, words, free, layout) if layout.takes_passing else None


def _fraction(label: str, words: Sequence[str], layout: Layout, taken: Collection[str]) -> Check | None:
    if len(schema.passing_columns(taken)) > 1:  # the curve says it
        return None
    if FRACTIONS & set(words) == {"fines"}:
        return replace(FRACTION, advice=_advice(label, FINES_COLUMN, layout))
    return FRACTION


def _test(label: str, words: Sequence[str], free: Mapping[tuple[str, ...], str], layout: Layout) -> Check | None:
    """Return the check for a heading with a word of a soil test in it, naming the free column that comes nearest."""
    hits = [word for word in words if word in TEST_WORDS or word.startswith(TEST_STEMS)]
    if not hits or ABOUT_WORDS & set(words):
        return None
    if SIZE_WORDS & set(hits):
        return replace(TEST, advice="not read; state the size in the heading: passing_0_075_mm_pct, or passing No. 200")
    fitting = {
        name: column
        for name, column in free.items()
        if _is_test(column) and any(_is_kin(hit, word) for hit in hits for word in name)
    }
    column = _nearest(_bare(words), fitting)
    return replace(TEST, advice=_advice(label, column, layout)) if column else None


def _nearest(words: Sequence[str], names: Mapping[tuple[str, ...], str]) -> str:
    """Return the column with the longest name inside a heading, else the most alike one; blank if there is none."""
    inside = [name for name in names if set(name) <= set(words)]
    if inside:
        return names[max(inside, key=lambda name: (len(name), -words.index(name[0])))]
    run_together = {"".join(name): column for name, column in names.items()}
    near = difflib.get_close_matches("".join(words), run_together, n=1, cutoff=0.0)
    return run_together[near[0]] if near else ""


def _advice(label: str, column: str, layout: Layout) -> str:
    size = schema.size_from_passing_column(column)
    title = schema.column(column).title if size is None else f"percent passing {size:g} mm"
    return f"not read; if it is {title}: {_remedy(label, column, layout)}"


def _remedy(label: str, column: str, layout: Layout) -> str:
    """Return how to say that a heading means a column."""
    said = f"{column} = {json.dumps(label, ensure_ascii=False)}"
    if layout.name in MAPPED_SECTIONS:
        return f"rename it, or write under [{layout.name}.columns]: {said}"
    if layout.name == "lab_results":
        return f"rename it to {column}"
    return f"rename it, or say so in the corridor file: columns = {{ {said} }}"


@cache
def _names(layout_name: str) -> Mapping[tuple[str, ...], str]:
    """Return the columns of a layout by the words of their headings, units left out."""
    found: dict[tuple[str, ...], str] = {}
    for column, names in spellings(schema.inputs()[layout_name]).items():
        for name in (*names, schema.column(column).title):
            found.setdefault(tuple(_bare(_WORD.findall(plain(name)))), column)
    return MappingProxyType(found)


def _bare(words: Sequence[str]) -> list[str]:
    """Return words without units, unless nothing is left."""
    return [word for word in words if not is_unit(word)] or list(words)


def _near(words: Sequence[str], names: Mapping[tuple[str, ...], str]) -> str:
    """Return the column whose heading has the same words, spelled a little otherwise or in another order, or blank.

    Examples
    --------
    >>> names = {("bottom", "depth"): "base_depth_m", ("sample",): "sample", ("liquid", "limit"): "liquid_limit_pct"}
    >>> [_near(words.split(), names) for words in ("depth bottom", "liqiud limitt", "liquidlimt", "sample type")]
    ['base_depth_m', 'liquid_limit_pct', 'liquid_limit_pct', '']
    """
    for name, column in names.items():
        if len(name) == len(words) and _is_matched(words, name):
            return column
    run_together = {"".join(name): column for name, column in names.items() if len(name) != len(words)}
    whole = "".join(words)
    near = difflib.get_close_matches(whole, run_together, n=1, cutoff=SAME_KEY) if len(whole) >= SHORT_KEY else []
    return run_together[near[0]] if near else ""


def _is_kin(word: str, other: str) -> bool:
    """Return whether two words have one stem: swelling and swell."""
    first, second = sorted((word, other), key=len)
    return word == other or (len(first) > SHORT_WORD and second.startswith(first)) or _is_same(word, other)


def _is_matched(words: Sequence[str], name: Sequence[str]) -> bool:
    left = list(name)
    for word in words:
        same = next((other for other in left if _is_same(word, other)), None)
        if same is None:
            return False
        left.remove(same)
    return True


def _is_same(word: str, other: str) -> bool:
    if min(len(word), len(other)) <= SHORT_WORD:
        return word == other
    return difflib.SequenceMatcher(None, word, other).ratio() >= SAME_WORD
