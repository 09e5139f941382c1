"""From cells to steps: the design zone, the verdict of a step, and the draws behind it."""

from __future__ import annotations

import json

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from hypothesis.extra import numpy as hnp

from geomap.profile import subgrade
from geomap.profile.cells import Levels, cell_table, entropy, odds_text, sheet, step_edges
from geomap.profile.verdicts import Scale, governing_rule, shares, suitability, zone_draws

SCALE = Scale(("suitable", "treat", "unsuitable", "not assessed"), (2, 3, 1, 0))


def levels(ground: list[float], formation: list[float]) -> Levels:
    return Levels(np.array(ground), np.array(formation), np.full(len(ground), 12.0))


@given(st.floats(0.5, 20_000), st.floats(1, 500))
def test_steps_tile_the_alignment(length: float, step: float) -> None:
    edges = step_edges(length, step)
    assert edges[0] == 0
    assert edges[-1] == length
    assert np.diff(edges).min() >= min(length, 0.0099 * step)
    assert np.diff(edges).max() <= step * 1.011


def test_the_profile_reaches_one_meter_below_the_design_zone_in_a_cut() -> None:
    page = sheet(step_edges(30, 10), levels([10, 10, 10], [10, 4, 12]), 0.25, 6.0, 1.0)
    assert page.is_used.sum(axis=1).tolist() == [24, 32, 24]  # 6 m, 6 + 1 + 1 m in the cut, 6 m


def test_the_design_zone_lies_below_formation_and_only_in_natural_ground() -> None:
    page = sheet(step_edges(40, 10), levels([10, 10, 10, 10], [10, 8, 10.5, 12]), 0.25, 6.0, 1.0)
    zone = subgrade.natural_zone(page)
    assert zone.counts.tolist() == [4, 4, 2, 0]
    assert np.flatnonzero(zone.in_zone[1]).tolist() == [8, 9, 10, 11]  # 2 m to 3 m below ground
    assert subgrade.subgrade_material(page).tolist() == ["natural", "natural", "mixed", "imported"]


def test_lowering_the_formation_moves_the_zone_by_just_as_much() -> None:
    high = sheet(step_edges(10, 10), levels([10], [9]), 0.25, 6.0, 1.0)
    low = sheet(step_edges(10, 10), levels([10], [8]), 0.25, 6.0, 1.0)
    assert (np.flatnonzero(low.in_zone[0]) - np.flatnonzero(high.in_zone[0])).tolist() == [4] * 4


def test_without_a_formation_the_zone_starts_at_the_ground_and_there_is_no_material() -> None:
    page = sheet(step_edges(10, 10), levels([10], [np.nan]), 0.25, 6.0, 1.0)
    assert np.flatnonzero(page.in_zone[0]).tolist() == [0, 1, 2, 3]
    assert subgrade.subgrade_material(page).tolist() == [None]


def test_the_design_zone_takes_cells_of_which_it_takes_half_and_always_one() -> None:
    thick = sheet(step_edges(30, 10), levels([10, 10, 10], [10, 9.2, 9.4]), 1.0, 6.0, 1.0)
    assert [np.flatnonzero(row).tolist() for row in thick.in_zone] == [[0], [1], [1]]
    assert subgrade.subgrade_material(thick).tolist() == ["natural"] * 3


def test_a_zone_with_next_to_no_natural_ground_is_imported() -> None:
    page = sheet(step_edges(20, 10), levels([10, 10], [10.875, 10.876]), 0.25, 6.0, 1.0)
    assert subgrade.subgrade_material(page).tolist() == ["mixed", "imported"]
    assert page.in_zone.sum(axis=1).tolist() == [1, 0]


def test_the_rule_named_gives_the_verdict_or_is_the_reason_why_it_is_no_better() -> None:
    rules = ["SP ok", "SM ok", "CH treat", "PT out"]
    gives = ["suitable", "suitable", "treat", "unsuitable"]
    membership = np.array([[0.4, 0.35, 0.25, 0.0], [0.5, 0.2, 0.1, 0.2], [0.1, 0.1, 0.2, 0.6]])
    verdict = np.array(["suitable", "treat", "unsuitable"], dtype=object)
    assert governing_rule(rules, gives, membership, verdict, SCALE).tolist() == ["SP ok", "PT out", "PT out"]


VERDICTS = [
    # suitable treat unsuitable not assessed -> word
    ([0.95, 0.03, 0.02, 0.00], "suitable"),
    ([0.40, 0.05, 0.50, 0.05], "unsuitable"),
    ([0.89, 0.00, 0.11, 0.00], "treat"),  # one chance in nine of unsuitable soil is too much for "suitable"
    ([0.75, 0.05, 0.00, 0.20], "not assessed"),
    ([0.30, 0.65, 0.05, 0.00], "treat"),  # rarely unsuitable, but mostly to be treated
    ([0.10, 0.20, 0.30, 0.40], "not assessed"),
]


@pytest.mark.parametrize(("shares_", "word"), VERDICTS)
def test_the_word_for_a_step(shares_: list[float], word: str) -> None:
    assert suitability(np.array([shares_]), SCALE).tolist() == [word]


def test_one_bad_thickness_makes_the_zone_bad() -> None:
    probability = np.zeros((1, 4, 4))
    probability[0, :, 0] = 1.0
    probability[0, 2] = [0.7, 0, 0.3, 0]
    fields = [np.full((1, 4), u, dtype=np.float32) for u in np.linspace(0.005, 0.995, 100)]
    draws = zone_draws(probability, np.ones((1, 4), bool), fields, SCALE)
    assert shares(draws, 4).round(2).tolist() == [[0.7, 0.0, 0.3, 0.0]]


def test_cells_that_share_a_field_turn_bad_together_and_independent_ones_do_not() -> None:
    probability = np.zeros((1, 4, 4))
    probability[0, :, 0], probability[0, :, 2] = 0.8, 0.2
    rng = np.random.default_rng(5)
    together = [np.full((1, 4), rng.random(), dtype=np.float32) for _ in range(4000)]
    apart = [rng.random((1, 4), dtype=np.float32) for _ in range(4000)]
    zone = np.ones((1, 4), bool)
    assert shares(zone_draws(probability, zone, together, SCALE), 4)[0, 2] == pytest.approx(0.2, abs=0.02)
    assert shares(zone_draws(probability, zone, apart, SCALE), 4)[0, 2] == pytest.approx(1 - 0.8**4, abs=0.02)


def test_fill_that_is_not_assessed_hides_a_good_natural_part_but_not_a_bad_one() -> None:
    draws = np.array([[0, 2]] * 4, dtype=np.int8)  # suitable once, unsuitable once
    material = np.array(["natural", "mixed", "imported", None], dtype=object)
    probability = shares(subgrade.with_fill(draws, material, 3, 3, SCALE), 4)
    assert probability.tolist() == [[0.5, 0, 0.5, 0], [0, 0, 0.5, 0.5], [0, 0, 0, 1], [0, 0, 0, 1]]
    probability = shares(subgrade.with_fill(draws, material, 0, 3, SCALE), 4)
    assert probability.tolist() == [[0.5, 0, 0.5, 0], [0.5, 0, 0.5, 0], [1, 0, 0, 0], [0, 0, 0, 1]]


@given(hnp.arrays(float, (7, 5), elements=st.floats(0.001, 1)))
def test_odds_add_to_one_and_list_every_symbol_that_counts(raw: np.ndarray) -> None:
    probability = raw / raw.sum(axis=1, keepdims=True)
    symbols = ["GW", "SM", "CL", "CH", "n/d"]
    for text, row in zip(odds_text(probability, symbols), probability, strict=True):
        odds = json.loads(text)
        assert abs(sum(odds.values()) - 1) <= 0.01
        assert {s for s, p in zip(symbols, row, strict=True) if p >= 0.0051} <= set(odds)
        assert list(odds.values()) == sorted(odds.values(), reverse=True)


def test_entropy_is_nought_when_sure_and_one_when_all_are_equally_likely() -> None:
    assert entropy(np.array([[1.0, 0.0], [0.5, 0.5]])).round(6).tolist() == [0, 1]


def test_cells_stand_in_the_plane_of_distance_and_level() -> None:
    page = sheet(step_edges(20, 10), levels([10, 11], [10, 10]), 0.5, 1.0, 1.0)
    cells = int(page.is_used.size)
    odds = {"astm_d2487": (np.tile([0.7, 0.3], (cells, 1)), ["CL", "CH"])}
    verdict = np.tile([1.0, 0, 0, 0], (cells, 1))
    table = cell_table(page, odds, verdict, SCALE, np.full(cells, "inferred", dtype=object))
    first = table.iloc[0]
    assert first["geometry"].bounds == (0, 9.5, 10, 10)
    assert (first["soil_group"], first["probability"], first["cell"]) == ("CL", 0.7, "00001-001")
    assert len(table) == page.is_used.sum()
    assert table["cell"].is_unique
