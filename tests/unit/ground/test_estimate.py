"""Shares of records between borings: what must hold whatever the ground is."""

from __future__ import annotations

import numpy as np
import pandas as pd
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from geomap.errors import InputError
from geomap.ground import neighbors, records
from geomap.ground.estimate import Grid, estimate
from geomap.ground.neighbors import Ranges


def soils_table(rows: list[tuple[str, float, float, float, str, str]], hole_depth: float = 5.0) -> pd.DataFrame:
    """Rows of boring, distance, top, base, origin, unit."""
    table = pd.DataFrame(rows, columns=["boring", "distance_m", "top_depth_m", "base_depth_m", "origin", "unit"])
    return table.assign(offset_m=0.0, hole_depth_m=hole_depth)


def grid(length: float = 600.0, step: float = 10.0, depth: float = 4.0, thickness: float = 0.5) -> Grid:
    distance = np.arange(step / 2, length, step)
    return Grid(distance, np.arange(thickness / 2, depth, thickness), np.full(len(distance), 6.0))


NO_LAYERS = soils_table([])


def test_shares_of_every_cell_add_to_one() -> None:
    soils = soils_table([("A", 100.0, 0, 1, "", ""), ("A", 100.0, 2, 3, "", ""), ("B", 400.0, 0, 1, "", "")])
    result = estimate(soils, NO_LAYERS, np.ones(3, bool), grid(), Ranges())
    shares = result.ensemble.tally(np.eye(3))
    np.testing.assert_allclose(shares.sum(axis=1), 1.0, atol=1e-9)
    assert (shares >= 0).all()


def test_beside_a_boring_its_own_sample_has_nearly_the_whole_share() -> None:
    soils = soils_table([("A", 105.0, 1.0, 1.5, "", ""), ("B", 405.0, 1.0, 1.5, "", "")])
    result = estimate(soils, NO_LAYERS, np.ones(2, bool), grid(), Ranges())
    shares = result.ensemble.tally(np.eye(2)).reshape(*grid().shape, 2)
    assert shares[10, 2, 0] > 0.95  # the cell at 105 m, 1.25 m deep
    assert shares[40, 2, 1] > 0.95


def test_far_from_every_boring_the_shares_are_those_of_the_site() -> None:
    soils = soils_table([("A", 100.0, 1.0, 1.5, "", ""), ("B", 150.0, 1.0, 1.5, "", "")])
    far = grid(length=5000.0)
    result = estimate(soils, NO_LAYERS, np.ones(2, bool), far, Ranges())
    shares = result.ensemble.tally(np.eye(2)).reshape(*far.shape, 2)
    np.testing.assert_allclose(shares[-1], 0.5, atol=1e-3)
    evidence = result.evidence.reshape(far.shape)
    assert (evidence[-1] == "no data").all()


def shares(soils: pd.DataFrame, layers: pd.DataFrame, answered: list[bool] | None = None) -> np.ndarray:
    """Shares by step, row and record: the specimens first, then the layers, those that never speak with 0."""
    told = np.ones(len(soils), bool) if answered is None else np.array(answered)
    result = estimate(soils, layers, told, grid(), Ranges())
    every = pd.concat([soils, layers])
    names = [f"{r.boring} {r.top_depth_m:g} {r.origin} {r.unit}" for r in every.itertuples()]
    spoken = [f"{r.boring} {r.top_depth_m:g} {r.origin} {r.unit}" for r in result.records.itertuples()]
    membership = np.array([[name == one for name in names] for one in spoken], dtype=float)
    return result.ensemble.tally(membership).reshape(*grid().shape, len(every))


def test_a_soil_never_votes_where_the_log_names_another_origin() -> None:
    soils = soils_table([("A", 105.0, 0.0, 1.0, "made ground", ""), ("A", 105.0, 2.0, 3.0, "natural", "clay")])
    layers = soils_table([("A", 105.0, 0.0, 1.5, "made ground", ""), ("A", 105.0, 1.5, 4.0, "natural", "clay")])
    at_hole = shares(soils, layers)[10]
    assert (at_hole[:3, 0] > 0.99).all()  # logged as made ground down to 1.5 m: the clay has no vote
    assert (at_hole[3:, 1] > 0.99).all()  # and the made ground none below it, close as it is


def test_a_layer_without_a_sample_speaks_over_its_whole_depth_and_distant_holes_do_not_contradict_it() -> None:
    layers = soils_table(
        [
            ("A", 305.0, 0.0, 4.0, "natural", ""),
            ("B", 5.0, 0.0, 4.0, "natural", ""),
            ("C", 595.0, 0.0, 4.0, "natural", ""),
        ]
    )
    at_hole = shares(NO_LAYERS, layers)[30]
    assert (at_hole[:, 0] > 0.9).all()


def test_the_one_sample_of_a_layer_speaks_for_all_of_it() -> None:
    soils = soils_table([("A", 305.0, 0.5, 1.0, "natural", "clay"), ("B", 5.0, 0.5, 4.0, "natural", "clay")])
    layers = soils_table([("A", 305.0, 0.0, 4.0, "natural", "clay"), ("B", 5.0, 0.0, 4.0, "natural", "clay")])
    assert (shares(soils, layers)[30, :, 0] > 0.9).all()


def test_a_sample_that_nobody_could_classify_keeps_its_own_depth_and_no_distant_soil_answers_for_it() -> None:
    soils = soils_table([("A", 305.0, 0.0, 4.0, "", ""), ("B", 5.0, 0.0, 4.0, "", "")])
    assert (shares(soils, NO_LAYERS, [False, True])[30, :, 0] > 0.9).all()


def test_in_a_layer_the_rest_goes_to_the_sample_that_has_an_answer() -> None:
    soils = soils_table([("A", 305.0, 0.5, 1.0, "natural", "clay"), ("A", 305.0, 2.0, 2.5, "natural", "clay")])
    layers = soils_table([("A", 305.0, 0.0, 4.0, "natural", "clay")])
    at_hole = shares(soils, layers, [True, False])[30]
    assert at_hole[4, 1] > 0.8  # its own depth, 2.0 to 2.5 m
    assert at_hole[6:, 0].min() > 0.5  # below it the layer is what the classified sample says


def test_a_unit_that_only_the_samples_name_is_one_with_the_layer_that_holds_them() -> None:
    soils = soils_table([("A", 105.0, 1.0, 2.0, "natural", "sand"), ("B", 115.0, 0.0, 0.5, "made ground", "")])
    layers = soils_table([("A", 105.0, 0.0, 4.0, "natural", ""), ("B", 115.0, 0.0, 0.5, "made ground", "")])
    assert (shares(soils, layers)[10, 1:, 0] > 0.9).all()


def test_a_boring_without_a_log_keeps_its_own_soils() -> None:
    soils = soils_table([("A", 105.0, 0.0, 4.0, "natural", "sand"), ("B", 145.0, 0.0, 4.0, "natural", "clay")])
    layers = soils_table([("B", 145.0, 0.0, 4.0, "natural", "clay")])
    assert (shares(soils, layers)[10, :, 0] > 0.9).all()


def test_a_sample_of_another_origin_than_its_layer_speaks_for_itself_only() -> None:
    soils = soils_table([("A", 105.0, 1.0, 2.0, "made ground", "")])
    layers = soils_table([("A", 105.0, 0.0, 4.0, "natural", "")])
    at_hole = shares(soils, layers)[10]
    assert (at_hole[2:4, 0] > 0.9).all()
    assert (at_hole[5:, 1] > 0.9).all()


def test_units_spelled_with_other_capitals_are_one() -> None:
    table = soils_table([("A", 0.0, 0, 1, "natural", "Alluvium "), ("A", 0.0, 0, 1, "natural", "alluvium")])
    assert records.domains(table).nunique() == 1


def test_a_soil_of_unknown_origin_takes_that_of_the_nearest_point_that_has_one() -> None:
    soils = soils_table([("B", 115.0, 0.0, 1.0, "", ""), ("A", 105.0, 2.0, 3.0, "natural", "clay")])
    layers = soils_table([("A", 105.0, 0.0, 1.5, "made ground", ""), ("A", 105.0, 1.5, 4.0, "natural", "clay")])
    result = estimate(soils, layers, np.ones(2, bool), grid(), Ranges())
    of_record = dict(
        zip(result.records["boring"] + result.records["origin"], result.ensemble.record_domain, strict=True)
    )
    assert of_record["B"] == of_record["Amade ground"]


def test_nested_layers_the_one_that_begins_deeper_holds_the_place() -> None:
    layers = soils_table([("A", 0.0, 0.0, 5.0, "", ""), ("A", 0.0, 1.0, 2.0, "", "")])
    boring = pd.Series(["A", "A", "A", "B"])
    assert records.covering(boring, np.array([0.5, 1.5, 3.0, 1.0]), layers).tolist() == [0, 1, 0, -1]


def test_a_layer_without_thickness_says_nothing() -> None:
    soils = soils_table([("A", 105.0, 0.0, 4.0, "natural", "")])
    flat = soils_table([("A", 105.0, 2.0, 2.0, "natural", "")])
    assert len(estimate(soils, flat, np.ones(1, bool), grid(), Ranges()).records) == 1


def test_evidence_is_observed_only_beside_a_hole_and_at_the_depths_it_covers() -> None:
    soils = soils_table([("A", 105.0, 1.0, 2.0, "", ""), ("B", 300.0, 1.0, 2.0, "", "")], hole_depth=3.0)
    evidence = estimate(soils, NO_LAYERS, np.ones(2, bool), grid(), Ranges()).evidence.reshape(grid().shape)
    assert np.argwhere(evidence == "observed").tolist() == [[10, 2], [10, 3], [29, 2], [29, 3], [30, 2], [30, 3]]
    assert (evidence[20, :6] == "inferred").all()
    assert (evidence[:, 6:] == "no data").all()  # deeper than every hole


def test_a_long_step_is_observed_only_where_its_center_is_beside_the_hole() -> None:
    soils = soils_table([("A", 105.0, 0.0, 4.0, "", "")])
    coarse = grid(step=100.0)
    evidence = estimate(soils, NO_LAYERS, np.ones(1, bool), coarse, Ranges()).evidence.reshape(coarse.shape)
    assert "observed" not in evidence


def test_a_hole_off_the_formation_does_not_observe_it() -> None:
    soils = soils_table([("A", 105.0, 0.0, 4.0, "", "")]).assign(offset_m=20.0)
    assert "observed" not in estimate(soils, NO_LAYERS, np.ones(1, bool), grid(), Ranges()).evidence


def test_a_short_sample_and_one_without_base_show_the_cell_they_lie_in() -> None:
    soils = soils_table([("A", 105.0, 1.0, 1.2, "", ""), ("A", 105.0, 2.75, np.nan, "", "")])
    evidence = estimate(soils, NO_LAYERS, np.ones(2, bool), grid(), Ranges()).evidence.reshape(grid().shape)
    assert np.flatnonzero(evidence[10] == "observed").tolist() == [2, 5]


def test_no_soil_at_all_is_refused() -> None:
    with pytest.raises(InputError, match="nothing can be estimated"):
        estimate(NO_LAYERS, NO_LAYERS, np.ones(0, bool), grid(), Ranges())


def test_one_sample_speaks_for_the_whole_corridor_but_says_no_data_far_off() -> None:
    result = estimate(soils_table([("A", 105.0, 1.0, 1.5, "", "")]), NO_LAYERS, np.ones(1, bool), grid(), Ranges())
    np.testing.assert_allclose(result.ensemble.tally(np.ones((1, 1))), 1.0)
    assert result.evidence.reshape(grid().shape)[-1, 2] == "no data"


def test_the_nearest_records_give_what_all_of_them_give(monkeypatch: pytest.MonkeyPatch) -> None:
    rng = np.random.default_rng(3)
    rows = [(f"B{k}", 25.0 * k, 0.25 + z, 0.75 + z, "", "") for k in range(60) for z in range(4)]
    soils = soils_table(rows)
    group = np.eye(3)[rng.integers(0, 3, len(rows))]
    line = grid(length=1500.0, step=20.0, depth=4.0)
    nearest = estimate(soils, NO_LAYERS, np.ones(len(rows), bool), line, Ranges()).ensemble.tally(group)
    monkeypatch.setattr(neighbors, "NEAREST", len(rows))
    everything = estimate(soils, NO_LAYERS, np.ones(len(rows), bool), line, Ranges()).ensemble.tally(group)
    assert np.abs(everything - nearest).max() < 0.02


def test_samples_take_what_the_log_says_where_they_say_nothing() -> None:
    samples = soils_table([("A", 0.0, 1.0, 1.5, "", "")]).assign(visual_group=None, origin=None, unit=None)
    strata = soils_table([("A", 0.0, 0.0, 0.3, "topsoil", ""), ("A", 0.0, 0.3, 3.0, "natural", "clay")])
    strata = strata.assign(visual_group=["OL", "CL"])
    told = records.with_log(samples, strata)
    assert told[["visual_group", "origin", "unit"]].values.tolist() == [["CL", "natural", "clay"]]
    rows = records.layer_rows(strata, samples, first=7)
    assert rows.index.tolist() == [7, 8]
    assert rows["visual_group"].tolist() == ["OL", "CL"]


@settings(max_examples=25, deadline=None)
@given(st.data())
def test_shuffling_the_records_changes_nothing(data: st.DataObject) -> None:
    count = data.draw(st.integers(2, 8))
    numbers = st.integers(0, 60)
    rows = [
        (f"B{data.draw(numbers)}", 10.0 * data.draw(numbers), d := data.draw(st.integers(0, 3)) * 1.0, d + 0.5, "", "")
        for _ in range(count)
    ]
    soils = soils_table(rows)
    group = np.eye(3)[data.draw(st.lists(st.integers(0, 2), min_size=count, max_size=count))]
    order = np.array(data.draw(st.permutations(range(count))))
    small = grid(step=50.0, depth=3.0)
    one = estimate(soils, NO_LAYERS, np.ones(count, bool), small, Ranges()).ensemble.tally(group)
    other = estimate(soils.iloc[order], NO_LAYERS, np.ones(count, bool), small, Ranges()).ensemble.tally(group[order])
    np.testing.assert_allclose(one, other, atol=1e-6)
