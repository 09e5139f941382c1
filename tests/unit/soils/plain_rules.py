"""ASTM D2487 and AASHTO M 145 for one sample at a time, plainly: a second writing of the rules, to compare with.

Written from the text of the rules, one sample, one branch after another, in whole numbers so that nothing is left to
binary fractions; nothing of it is shared with geomap. Missing results are None. `symbols_left` and `groups_left` find
what missing results leave open by trying values of them.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass, replace


@dataclass(frozen=True)
class Sample:
    """Results of one sample as reported [%]; None is missing."""

    p4: float | None = None
    p10: float | None = None
    p40: float | None = None
    p200: float | None = None
    cu: float | None = None
    cc: float | None = None
    ll: float | None = None
    pl: float | None = None
    pi: float | None = None
    nonplastic: bool = False
    ll_oven: float | None = None
    by_eye: str = ""
    cobbles: float | None = None
    boulders: float | None = None


def whole(value: float) -> int:
    return math.floor(value + 0.5)


def fines_by_chart(s: Sample) -> str:
    """Return ML, CL-ML, CL, MH or CH; raises LookupError where a limit is missing."""
    ll, pi = limits(s)
    over_line = 100 * pi >= 73 * (ll - 20)
    if ll < 50:
        if over_line and pi > 7:
            return "CL"
        return "CL-ML" if over_line and 4 <= pi <= 7 else "ML"
    return "CH" if over_line else "MH"


def limits(s: Sample) -> tuple[int, int]:
    ll = None if s.ll is None else whole(s.ll)
    pl = None if s.pl is None else whole(s.pl)
    pi = None if s.pi is None else whole(s.pi)
    if ll is not None and pl is not None:
        pi = ll - pl
    elif ll is None and pl is not None and pi is not None:
        ll = pl + pi
    if s.nonplastic or (pi is not None and pi <= 0):
        return (ll or 0), 0
    if ll is None or pi is None:
        raise LookupError("limits")
    return ll, pi


def is_organic(s: Sample) -> bool:
    if s.ll is None or s.ll_oven is None:
        return False
    return 4 * whole(s.ll_oven) < 3 * whole(s.ll)


def d2487(s: Sample) -> tuple[str, str]:
    """Return symbol and group name; raises LookupError naming what is missing."""
    if s.p200 is None:
        raise LookupError("p200")
    fines = whole(s.p200)
    if fines >= 50:
        return fine_grained(s, fines)
    if s.p4 is None:
        raise LookupError("p4")
    gravel = 100 - whole(s.p4)
    sand = 100 - gravel - fines
    letter, noun, other = ("G", "gravel", "sand") if 2 * gravel > 100 - fines else ("S", "sand", "gravel")
    items = []
    if fines <= 12:
        word = grading_word(s, letter)
        symbol, name = f"{letter}{word}", f"{'well-graded' if word == 'W' else 'poorly graded'} {noun}"
    if 5 <= fines <= 12:
        silty_or_clayey, item = dual_part(s)
        symbol += f"-{letter}{silty_or_clayey}"
        items.append(item)
    elif fines > 12:
        chart = fines_by_chart(s)
        if chart == "CL-ML":
            symbol, name = f"{letter}C-{letter}M", f"silty, clayey {noun}"
        elif chart in ("ML", "MH"):
            symbol, name = f"{letter}M", f"silty {noun}"
        else:
            symbol, name = f"{letter}C", f"clayey {noun}"
    if {"sand": sand, "gravel": gravel}[other] >= 15:
        items.append(other)
    if fines >= 5 and is_organic(s):
        items.append("organic fines")
    return symbol, said(name, items + stones(s))


def dual_part(s: Sample) -> tuple[str, str]:
    try:
        chart = fines_by_chart(s)
    except LookupError:
        if not s.by_eye:
            raise
        return {"silt": ("M", "silt"), "clay": ("C", "clay")}[s.by_eye]
    return {"ML": ("M", "silt"), "MH": ("M", "silt"), "CL-ML": ("C", "silty clay")}.get(chart, ("C", "clay"))


def grading_word(s: Sample, letter: str) -> str:
    least = 4 if letter == "G" else 6
    if (s.cu is not None and s.cu < least) or (s.cc is not None and not 1 <= s.cc <= 3):
        return "P"
    if s.cu is None or s.cc is None:
        raise LookupError("cu, cc")
    return "W"


def fine_grained(s: Sample, fines: int) -> tuple[str, str]:
    chart = fines_by_chart(s)
    noun = {"ML": "silt", "CL-ML": "silty clay", "CL": "lean clay", "MH": "elastic silt", "CH": "fat clay"}[chart]
    symbol = chart
    if is_organic(s):
        symbol = "OH" if chart in ("MH", "CH") else "OL"
        noun = "organic silt" if chart in ("ML", "MH") else "organic clay"
    coarse = 100 - fines
    if coarse < 15:
        return symbol, said(noun, stones(s))
    if s.p4 is None:
        return symbol, ""
    gravel = 100 - whole(s.p4)
    sand = coarse - gravel
    if coarse < 30:
        return symbol, said(noun, ["sand" if sand >= gravel else "gravel", *stones(s)])
    first, second, lesser = ("sandy", "gravel", gravel) if sand >= gravel else ("gravelly", "sand", sand)
    return symbol, said(f"{first} {noun}", [second] * (lesser >= 15) + stones(s))


def stones(s: Sample) -> list[str]:
    return ["cobbles"] * bool(s.cobbles) + ["boulders"] * bool(s.boulders)


def said(noun: str, items: list[str]) -> str:
    if not items:
        return noun
    last = items[-1]
    rest = items[:-1]
    if not rest:
        return f"{noun} with {last}"
    return f"{noun} with {rest[0]} and {last}" if len(rest) == 1 else f"{noun} with {', '.join(rest)}, and {last}"


def m145(s: Sample) -> tuple[str, int]:  # noqa: PLR0911 - one return for each entry of the table
    """Return group and group index; raises LookupError where something is missing."""
    if s.p200 is None:
        raise LookupError("p200")
    f = whole(s.p200)
    if f > 35:
        ll, pi = limits(s)
        index = group_index(f, ll, pi)
        if ll <= 40:
            return ("A-4" if pi <= 10 else "A-6"), index
        if pi <= 10:
            return "A-5", index
        return ("A-7-5" if pi <= ll - 30 else "A-7-6"), index
    if s.p10 is None or s.p40 is None:
        raise LookupError("p10, p40")
    ten, forty = whole(s.p10), whole(s.p40)
    ll, pi = limits(s)
    if ten <= 50 and forty <= 30 and f <= 15 and pi <= 6:
        return "A-1-a", 0
    if forty <= 50 and f <= 25 and pi <= 6:
        return "A-1-b", 0
    if forty >= 51 and f <= 10 and pi == 0:
        return "A-3", 0
    if pi <= 10:
        return ("A-2-4" if ll <= 40 else "A-2-5"), 0
    index = max(0, ((f - 15) * (pi - 10) + 50) // 100)
    return ("A-2-6" if ll <= 40 else "A-2-7"), index


def group_index(f: int, ll: int, pi: int) -> int:
    thousandths = (f - 35) * (200 + 5 * (ll - 40)) + 10 * (f - 15) * (pi - 10)
    return max(0, (thousandths + 500) // 1000)


GREATEST_LIMIT = 500


def possible_limits(s: Sample) -> list[tuple[int, int]]:
    """Return the pairs of liquid limit and index that the reported limits leave, every whole value being tried."""
    try:
        return [limits(s)]
    except LookupError:
        pass
    if s.ll is not None:
        return [(whole(s.ll), pi) for pi in range(whole(s.ll) + 1)]
    lls = range(GREATEST_LIMIT + 1)
    if s.pi is not None:
        return [(ll, whole(s.pi)) for ll in lls if ll >= whole(s.pi)]
    if s.pl is not None:
        return [(ll, ll - whole(s.pl)) for ll in lls if ll >= whole(s.pl)]
    # Both missing: values on both sides of each limit of the rules will do.
    some = [0, 1, 3, 5, 6, 7, 8, 10, 11, 12, 20, 30, 40, 41, 42, 49, 50, 70, 72, 100, GREATEST_LIMIT]
    return [(ll, pi) for ll in some for pi in some if pi <= ll]


def symbols_left(s: Sample) -> dict[str, set[str]]:
    """Return the symbols of D2487 that missing results leave, each with its names; Cu and Cc are known."""
    finer = [value for value in (s.p10, s.p40, s.p200) if value is not None]
    p4s = [s.p4] if s.p4 is not None else range(max(whole(value) for value in finer), 101)
    one_of_each_zone = {fines_by_chart(replace(s, ll=ll, pl=None, pi=pi)): (ll, pi) for ll, pi in possible_limits(s)}
    found: dict[str, set[str]] = {}
    for p4, (ll, pi) in itertools.product(p4s, one_of_each_zone.values()):
        symbol, name = d2487(replace(s, p4=p4, ll=ll, pl=None, pi=pi))
        found.setdefault(symbol, set()).add(name)
    return found


def groups_left(s: Sample) -> tuple[set[str], set[int]]:
    """Return the groups of M 145 that missing results leave, and all their indexes."""
    least = whole(s.p200 or 0)
    most = 100 if s.p4 is None else whole(s.p4)
    groups, indexes = set(), set()
    edges = [30, 31, 50, 51]
    pairs = possible_limits(s)
    for p40 in [whole(s.p40)] if s.p40 is not None else [least, *edges, most]:
        for p10 in [whole(s.p10)] if s.p10 is not None else [p40, *edges, most]:
            if least <= p40 <= p10 <= most:
                for ll, pi in pairs:
                    group, index = m145(replace(s, p10=p10, p40=p40, ll=ll, pl=None, pi=pi))
                    groups.add(group)
                    indexes.add(index)
    return groups, indexes
