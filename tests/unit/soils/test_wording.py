"""Columns of text made from codes."""

from __future__ import annotations

import numpy as np
import pandas as pd

from geomap.soils import reasons, wording


def listed(column: pd.Categorical) -> list[str | None]:
    return [None if pd.isna(text) else str(text) for text in column]


def test_only_names_that_occur_are_categories() -> None:
    found = wording.used_categories(np.array([3, 0, 1, 3], dtype=np.int16), ["a", "b", "c"])
    assert listed(found) == ["c", None, "a", "c"]
    assert list(found.categories) == ["a", "c"]


def test_two_codes_may_say_the_same() -> None:
    found = wording.texts_from(np.array([2, 5, 0, 7]), lambda code: {2: "one", 5: "one", 7: ""}[code])
    assert listed(found) == ["one", "one", None, None]


def test_no_rows_make_no_texts() -> None:
    assert listed(wording.texts_from(np.zeros(0, dtype=np.int64), str)) == []
    assert listed(wording.texts_from(np.zeros(3, dtype=np.int64), str)) == [None] * 3


def test_candidates_keep_the_order_of_the_symbols_and_need_two() -> None:
    masks = np.array([0b101, 0b010, 0b000, 0b111], dtype=np.uint32)
    assert listed(wording.candidates(masks, ["GW", "GP", "SW"])) == ["GW;SW", None, None, "GW;GP;SW"]


def test_every_reason_has_a_bit_of_its_own_and_can_be_said_with_others() -> None:
    bits = np.array(list(reasons.BIT.values()), dtype=np.uint64)
    assert len(set(bits.tolist())) == len(reasons.PHRASES) <= 64
    together = np.array([np.bitwise_or.reduce(bits)], dtype=np.uint64)
    assert listed(reasons.column(together)) == ["; ".join(reasons.PHRASES.values())]
    assert listed(reasons.column(bits)) == list(reasons.PHRASES.values())
