"""What geomap makes of liquid limit, plastic limit and plasticity index read together.

Constructed from the rules of intake (defects 19 to 22 of the usual list of data defects); none is a published value.
A row reads: LL, PL, PI as written -> LL, PL, PI as used, non-plastic or not, and what is asked.
"""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.intake import accept, screen
from tests.unit.intake.written import raw

_ = None
CASES = [
    # Nothing to ask
    (("38", "20", "18"), (38, 20, 18), False, None),
    (("38.4", "20.2", "18.2"), (38.4, 20.2, 18.2), False, None),
    (("38", "20", "19"), (38, 20, 19), False, None),
    (("38", "20", ""), (38, 20, _), False, None),
    (("38", "", "18"), (38, _, 18), False, None),
    (("NP", "NP", "NP"), (_, _, _), True, None),
    (("24", "NP", "NP"), (24, _, _), True, None),
    (("", "", "NP"), (_, _, _), True, None),
    (("18", "20", "NP"), (18, 20, _), True, None),
    # 19: liquid limit below plastic limit
    (("20", "38", "18"), (_, _, _), False, "liquid limit below plastic limit"),
    (("20", "21", "-1"), (_, _, _), False, "liquid limit below plastic limit"),
    # 20: plasticity index is not liquid limit minus plastic limit
    (("38", "20", "20"), (38, 20, 20), False, "plasticity index differs"),
    (("38", "20", "81"), (38, 20, _), False, "plasticity index not below liquid limit"),
    # 21: NP in code
    (("0", "0", "0"), (_, _, _), True, "NP in code"),
    (("0", "", "0"), (_, _, _), True, "NP in code"),
    (("-1", "-1", "-1"), (_, _, _), True, "NP in code"),
    (("", "", "-1"), (_, _, _), True, "NP in code"),
    (("NP", "", "0"), (_, _, _), True, "NP in code"),
    (("24", "NP", "0"), (24, _, _), True, "NP in code"),
    (("24", "", "0"), (24, _, _), True, "plasticity index of zero"),
    (("24", "0", "0"), (24, _, _), True, "plasticity index of zero"),
    (("", "", "0"), (_, _, _), True, "plasticity index of zero"),
    (("22", "22", "0"), (22, _, _), True, "liquid and plastic limit equal"),
    (("30", "20", "NP"), (_, _, _), False, "NP beside plastic limits"),
    (("NP", "", "12"), (_, _, _), False, "NP beside plastic limits"),
    # 22: missing stored as zero
    (("0", "", ""), (_, _, _), False, "limit of zero"),
    (("0", "20", ""), (_, 20, _), False, "limit of zero"),
    (("38", "0", ""), (38, _, _), False, "limit of zero"),
    (("38", "20", "-1"), (38, 20, _), False, "negative limit"),
    # Unusual, used as it is: U-line PI = 0.9 (LL - 8) from LL = 16 (ASTM D2487, from memory)
    (("50", "12", "38"), (50, 12, 38), False, "above the U-line"),
    (("50", "13", "37"), (50, 13, 37), False, None),
    (("15", "12", "3"), (15, 12, 3), False, "very low liquid limit"),
    (("16", "12", "4"), (16, 12, 4), False, None),
]


@pytest.mark.parametrize(("written", "used", "nonplastic", "asked"), CASES, ids=[", ".join(c[0]) for c in CASES])
def test_limits(written: tuple[str, ...], used: tuple[float | None, ...], nonplastic: bool, asked: str | None) -> None:
    headings = "boring | top_depth_m | LL:liquid_limit_pct | PL:plastic_limit_pct | PI:plasticity_index_pct"
    taken = screen(accept([raw("samples", f"{headings}\nBH-1 | 1 | {' | '.join(written)}")]))
    row = taken.used("samples").iloc[0]
    limits = ("liquid_limit_pct", "plastic_limit_pct", "plasticity_index_pct")
    assert tuple(None if pd.isna(row[c]) else row[c] for c in limits) == used
    assert (not pd.isna(row["is_nonplastic"]) and bool(row["is_nonplastic"])) == nonplastic
    assert taken.findings["topic"].tolist() == ([asked] if asked else [])


def test_two_zeros_make_a_rejected_liquid_and_plasticity_index_beside_a_plastic_limit() -> None:
    headings = "boring | top_depth_m | LL:liquid_limit_pct | PL:plastic_limit_pct | PI:plasticity_index_pct"
    text = f"{headings}\nBH-1 | 1 | 0 | 20 | 0"
    taken = screen(accept([raw("samples", text)]))
    assert taken.findings["topic"].tolist() == ["limit of zero", "limit of zero"]
    assert taken.findings["heading"].tolist() == ["LL", "PI"]


def test_np_against_a_no_in_the_column_for_it_is_asked_about() -> None:
    text = "boring | top_depth_m | LL:liquid_limit_pct | NP:is_nonplastic\nBH-1 | 1 | NP | no\nBH-1 | 2 | NP | yes"
    taken = screen(accept([raw("samples", text)]))
    assert taken.used("samples")["is_nonplastic"].tolist() == [True, True]
    assert taken.findings[["topic", "row_number"]].values.tolist() == [["NP against yes or no", 2]]


def test_an_oven_dried_liquid_limit_above_the_other_is_asked_about() -> None:
    text = """
    boring | top_depth_m | LL:liquid_limit_pct | oven:liquid_limit_oven_dried_pct
    BH-1   | 1           | 60                  | 66
    BH-1   | 2           | 60                  | 40
    """
    taken = screen(accept([raw("samples", text)]))
    assert taken.findings[["topic", "row_number", "found"]].values.tolist() == [
        ["oven-dried liquid limit above the liquid limit", 2, "oven 66, LL 60"]
    ]
