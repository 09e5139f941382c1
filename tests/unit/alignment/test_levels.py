"""Levels along the line: tables and their defects, collars, and formation by reference. All constructed."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest

from geomap.alignment.chainage import Chainage, Equation
from geomap.alignment.levels import LevelTable, formation_level, ground_from_collars, levels_from_table
from geomap.errors import UsageError

OVERLAP = Chainage(0.0, (Equation(100.0, 50.0),))
ABSENT = np.nan


def table(rows: list[dict[str, object]]) -> pd.DataFrame:
    frame = pd.DataFrame(rows)
    for name, dtype in (
        ("distance_m", "float64"),
        ("chainage", "string"),
        ("level_m", "float64"),
        ("width_m", "float64"),
    ):
        frame[name] = pd.Series(frame.get(name), frame.index, dtype=dtype)
    return frame.assign(file="levels.csv", sheet="", row_number=range(2, len(frame) + 2))


def test_levels_are_straight_between_places_and_missing_beyond_them() -> None:
    levels, findings = levels_from_table(
        table([{"distance_m": 0.0, "level_m": 10.0}, {"chainage": "0+100", "level_m": 20.0}]), Chainage()
    )
    np.testing.assert_allclose(levels.level_at([-1, 0, 25, 100, 101, ABSENT]), [ABSENT, 10, 12.5, 20, ABSENT, ABSENT])
    assert len(findings) == 0
    assert levels.basis == "levels from a table of 2 places, straight between them"


def test_places_before_the_start_serve_the_first_step() -> None:
    levels, _ = levels_from_table(
        table([{"chainage": "0+980", "level_m": 8.0}, {"chainage": "1+020", "level_m": 12.0}]), Chainage(1000.0)
    )
    assert levels.level_at(0.0) == pytest.approx(10.0)


def test_rows_out_of_order_are_sorted_and_asked_about() -> None:
    levels, findings = levels_from_table(
        table([{"distance_m": d, "level_m": z} for d, z in [(0, 1), (50, 2), (20, 3), (60, 4)]]), Chainage()
    )
    np.testing.assert_array_equal(levels.distance, [0, 20, 50, 60])
    np.testing.assert_array_equal(levels.level, [1, 3, 2, 4])
    assert findings["topic"].tolist() == ["levels: order"]
    assert findings["row_number"].tolist() == [4]


# row, action, words of the advice
DEFECTS = [
    ({"level_m": 5.0}, "reject", "correct its place"),
    ({"chainage": "12,5", "level_m": 5.0}, "reject", "a comma is not read"),
    ({"chainage": "0+075", "level_m": 5.0}, "hold_out", "75.000 and 125.000 m"),
    ({"distance_m": 40.0}, "reject", "fill the level in"),
    ({"distance_m": 0.0, "level_m": 10.5}, "hold_out", "keep the right one"),
    ({"distance_m": 40.0, "chainage": "0+041", "level_m": 5.0}, "query", "distance_m was used"),
]


@pytest.mark.parametrize(("row", "action", "advice"), DEFECTS)
def test_a_defective_row_is_named_with_what_to_do(row: dict, action: str, advice: str) -> None:
    good = [{"distance_m": 0.0, "level_m": 10.0}, {"distance_m": 200.0, "level_m": 20.0}]
    levels, findings = levels_from_table(table([*good, row]), OVERLAP)
    ours = findings[findings["row_number"] == 4]
    assert (ours["action"] == action).any()
    assert ours["advice"].str.contains(advice, regex=False).any()
    assert (ours["file"] == "levels.csv").all()
    assert len(levels.distance) == (3 if action == "query" else 2)


def test_a_chainage_in_a_gap_does_not_occur() -> None:
    _, findings = levels_from_table(
        table([{"distance_m": 0.0, "level_m": 1.0}, {"chainage": "0+120", "level_m": 5.0}]),
        Chainage(0.0, (Equation(100.0, 150.0),)),
    )
    assert findings["advice"].str.contains("from 0+100 to 0+150 in one place", regex=False).all()


def test_a_chainage_that_occurs_twice_is_settled_by_a_distance() -> None:
    for distance in (75.0, 125.0):
        levels, findings = levels_from_table(
            table([{"distance_m": distance, "chainage": "0+075", "level_m": 5.0}]), OVERLAP
        )
        assert levels.distance.tolist() == [distance]
        assert len(findings) == 0


def test_the_same_level_twice_at_one_place_is_no_defect() -> None:
    levels, findings = levels_from_table(
        table([{"distance_m": 0.0, "level_m": 1.0}, {"distance_m": 0.0, "level_m": 1.0}]), Chainage()
    )
    assert levels.distance.tolist() == [0.0]
    assert len(findings) == 0


def test_a_table_of_no_use_blocks() -> None:
    levels, findings = levels_from_table(table([{"chainage": "?", "level_m": 5.0}]), Chainage())
    assert findings["action"].tolist() == ["reject", "block"]
    assert np.isnan(levels.level_at([0.0, 10.0])).all()
    _, findings = levels_from_table(table([{"distance_m": 0.0, "level_m": 1.0}]).iloc[:0], Chainage())
    assert findings["action"].tolist() == ["block"]


def test_widths_are_interpolated_where_given_and_the_default_serves_elsewhere() -> None:
    levels, _ = levels_from_table(
        table([{"distance_m": d, "level_m": 0.0, "width_m": w} for d, w in [(0, 10), (50, ABSENT), (100, 20)]]),
        Chainage(),
    )
    np.testing.assert_allclose(levels.width_at([-10, 25, 50, 120], default_m=7.0), [10, 12.5, 15, 20])
    bare = LevelTable(levels.distance, levels.level, np.full(3, np.nan), "")
    np.testing.assert_allclose(bare.width_at([0.0, 5.0], default_m=7.0), [7, 7])


def test_tables_are_left_as_they_were() -> None:
    given = table([{"distance_m": 50.0, "level_m": 2.0}, {"distance_m": 0.0, "level_m": 1.0}])
    before = given.copy()
    levels_from_table(given, Chainage())
    pd.testing.assert_frame_equal(given, before)


def test_ground_from_collars_is_straight_between_borings_and_held_beyond_them() -> None:
    ground = ground_from_collars([300.0, 100.0, 200.0, 250.0], [30.0, 10.0, ABSENT, 20.0])
    np.testing.assert_allclose(ground.level_at([0, 100, 175, 250, 275, 1000]), [10, 10, 15, 20, 25, 30])
    assert "3 borings" in ground.basis


def test_without_collars_the_ground_is_not_known() -> None:
    ground = ground_from_collars([10.0], [ABSENT])
    assert np.isnan(ground.level_at([0.0, 10.0])).all()
    assert "not known" in ground.basis


# reference, given, thickness, diameter, ground, formation level
REFERENCES = [
    ("formation", 100.0, 0.5, None, ABSENT, 100.0),
    ("finished_level", 100.0, 0.65, None, ABSENT, 99.35),
    ("invert", 98.0, 0.15, None, ABSENT, 97.85),
    ("crown", 98.6, 0.15, 0.6, ABSENT, 97.85),
    ("cover", 1.2, 0.15, 0.6, 100.0, 98.05),
    ("ground", ABSENT, 0.2, None, 100.0, 99.8),
    ("cover", 1.2, 0.15, 0.6, ABSENT, ABSENT),
    ("finished_level", ABSENT, 0.5, None, 100.0, ABSENT),
]


@pytest.mark.parametrize(("reference", "given", "thickness", "diameter", "ground", "formation"), REFERENCES)
def test_formation_level_by_reference(
    reference: str, given: float, thickness: float, diameter: float | None, ground: float, formation: float
) -> None:
    found = formation_level([given, given], reference, thickness, diameter, ground)
    np.testing.assert_allclose(found, [formation, formation])


@pytest.mark.parametrize(
    ("settings", "words"),
    [
        ({"reference": "soffit"}, "formation, finished_level, invert, crown, cover, ground"),
        ({"reference": "crown"}, "the outside diameter of the pipe"),
        ({"reference": "cover", "pipe_diameter_m": 0.0}, "the outside diameter of the pipe"),
        ({"reference": "invert", "construction_thickness_m": -0.1}, "0 or more"),
    ],
)
def test_settings_that_give_no_formation_are_wrong_usage(settings: dict, words: str) -> None:
    with pytest.raises(UsageError, match=r"corridor\.toml: formation") as error:
        formation_level([1.0], **settings)
    assert words in str(error.value)
