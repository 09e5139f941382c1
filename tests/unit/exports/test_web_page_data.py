"""The data block of the page says what the tables of the results say, and nothing else."""

from __future__ import annotations

import dataclasses
import json
from collections.abc import Mapping
from typing import Any

import numpy as np
import pandas as pd
import pytest

from geomap.exports.web_columns import ALPHABET
from geomap.exports.web_page_data import page_data
from geomap.exports.web_plan_data import degrees_from_projected
from geomap.exports.web_profile_data import EVIDENCE, SUITABILITY, TRACE_ROWS, trace
from geomap.results import Results
from geomap.tables import schema
from tests.unit.exports.sample import STEPS, THICKNESSES, sample_results

EIGHT_PER_THOUSAND = 0.008  # percent are whole: half of one, and the tables' own rounding


@pytest.fixture(scope="module")
def data(results: Results) -> dict[str, Any]:
    return page_data(results)


def with_tables(results: Results, **changed: pd.DataFrame) -> Results:
    return dataclasses.replace(results, tables={**results.tables, **changed})


def unpacked(codes: str, symbols: list[str]) -> list[str | None]:
    return [None if c == "-" else symbols[ALPHABET.index(c)] for c in codes]


def shares(packed: str) -> list[float]:
    pairs = [packed[at : at + 2] for at in range(0, len(packed), 2)]
    return [float("nan") if pair == "--" else int(pair, 36) / 100 for pair in pairs]


def odds_of(data: Mapping[str, Any], cell: int) -> dict[str, float]:
    symbols = [item["symbol"] for item in data["legend"]["groups"]]
    text = data["cells"]["odds"].split(" ")[cell]
    return {symbols[ALPHABET.index(text[at])]: int(text[at + 1 : at + 3], 36) / 100 for at in range(0, len(text), 3)}


def test_the_block_is_plain_json_without_nan(data: dict[str, Any]) -> None:
    assert json.loads(json.dumps(data, allow_nan=False)) == data


def test_cells_unpack_to_the_table(results: Results, data: dict[str, Any]) -> None:
    table = results.tables["profile_cells"]
    symbols = [item["symbol"] for item in data["legend"]["groups"]]
    assert unpacked(data["cells"]["group"], symbols) == table["soil_group"].tolist()
    assert unpacked(data["cells"]["evidence"], list(EVIDENCE)) == table["evidence"].tolist()
    assert unpacked(data["cells"]["suitability"], list(SUITABILITY)) == table["suitability"].tolist()
    np.testing.assert_allclose(shares(data["cells"]["probability"]), table["probability"], atol=EIGHT_PER_THOUSAND)
    np.testing.assert_allclose(shares(data["cells"]["unsuitable"]), table["p_unsuitable"], atol=EIGHT_PER_THOUSAND)
    np.testing.assert_allclose(data["cells"]["ground"], (table["top_level_m"] + table["top_depth_m"])[::THICKNESSES])


@pytest.mark.parametrize("cell", [0, 7, 311, STEPS * THICKNESSES - 1])
def test_odds_of_a_cell_are_those_of_the_table_likeliest_first(
    results: Results, data: dict[str, Any], cell: int
) -> None:
    expected = json.loads(results.tables["profile_cells"]["astm_d2487_odds"].iloc[cell])
    found = odds_of(data, cell)
    assert found == pytest.approx(expected, abs=EIGHT_PER_THOUSAND)
    assert list(found.values()) == sorted(found.values(), reverse=True)


def test_the_legend_holds_what_occurs_in_the_order_of_the_results(results: Results, data: dict[str, Any]) -> None:
    order = results.symbols("astm_d2487")
    found = [item["symbol"] for item in data["legend"]["groups"]]
    assert found == sorted(found, key=order.index)
    assert set(found) == {"PT", "CL", "SM", "GM", "n/d"}


def test_a_missing_cell_is_a_gap_and_shifts_nothing(results: Results, data: dict[str, Any]) -> None:
    lost = 5 * THICKNESSES + 3
    table = results.tables["profile_cells"].drop(index=results.tables["profile_cells"].index[lost])
    gapped = page_data(with_tables(results, profile_cells=table))["cells"]
    assert gapped["group"] == data["cells"]["group"][:lost] + "-" + data["cells"]["group"][lost + 1 :]
    assert gapped["odds"].split(" ")[lost] == ""
    assert gapped["ground"] == data["cells"]["ground"]


def test_lengths_by_suitability_and_evidence_add_up_to_the_line(results: Results, data: dict[str, Any]) -> None:
    table = results.tables["subgrade"]
    lengths = np.array(data["summary"]["lengths"])
    assert lengths.sum() == pytest.approx(STEPS * 10.0)
    for row, word in enumerate(SUITABILITY):
        assert lengths[row].sum() == pytest.approx(10.0 * (table["suitability"] == word).sum())


def test_counts_are_those_of_the_run(data: dict[str, Any]) -> None:
    assert data["summary"]["counts"]["borings"] == {"read": 4, "used": 3, "leftOut": 1}


def test_what_the_run_says_about_the_estimate_is_on_the_page(results: Results) -> None:
    run = pd.DataFrame({"key": ["seed", "estimation"], "value": ["1", "Ranges are fixed defaults"]})
    assert (
        page_data(with_tables(results, run=run))["summary"]["statement"]
        == "Between borings: Ranges are fixed defaults."
    )


def test_a_trace_names_the_weightiest_samples_and_sums_the_rest(results: Results) -> None:
    one = results.tables["trace"].query("step == 1")
    many = pd.concat([one.assign(sample=one["sample"] + f"-{k}", weight=0.01 * (k + 1)) for k in range(3)])
    packed = trace(with_tables(results, trace=many))
    assert packed["count"][0] == TRACE_ROWS
    assert packed["more"][0] == len(many) - TRACE_ROWS
    named = packed["weight"][: packed["count"][0]]
    assert named == sorted(named, reverse=True)
    assert (sum(named) + packed["rest"][0]) / 1000 == pytest.approx(many["weight"].sum())
    assert packed["count"][1:] == [0] * (STEPS - 1)


def test_every_named_weight_leads_to_its_sample_and_lab_sheet(results: Results, data: dict[str, Any]) -> None:
    packed, table = data["trace"], results.tables["trace"]
    step = 41
    start = sum(packed["count"][: step - 1])
    for at in range(start, start + packed["count"][step - 1]):
        record = packed["record"][at]
        sheet = packed["labSheet"]["w"][packed["labSheet"]["i"][record]]
        row = table.loc[(table["step"] == step) & (table["lab_sheet"] == sheet)].iloc[0]
        assert packed["weight"][at] == pytest.approx(1000 * row["weight"], abs=0.5)
        assert packed["boring"]["w"][packed["boring"]["i"][record]] == row["boring"]
        assert packed["row"]["w"][packed["row"]["i"][record]] == str(row["row_number"])


def test_the_rows_of_one_specimen_are_one_line_with_one_weight(results: Results) -> None:
    """Constructed: two test rows of one specimen in steps 1 and 2, and a logged layer without a specimen."""
    rows = [
        {
            "step": step,
            "specimen": specimen,
            "boring": "BH-1",
            "sample": sample,
            "top_depth_m": top,
            "base_depth_m": top + 0.5,
        }
        | {"weight": weight, "lab_sheet": sheet, "file": "samples.csv", "sheet": None, "row_number": row}
        for step in (1, 2)
        for specimen, sample, top, weight, sheet, row in (
            (7, "S1", 1.0, 0.6, "LAB-1", 4),
            (7, "S1 index", 1.2, 0.6, "LAB-2", 9),
            (pd.NA, None, 3.0, 0.3, None, 11),
        )
    ]
    packed = trace(with_tables(results, trace=pd.DataFrame(rows)))
    assert packed["count"][:3] == [2, 2, 0]
    assert packed["weight"] == [600, 300, 600, 300]
    assert packed["record"] == [0, 1, 0, 1]
    assert packed["sample"] == {"w": ["S1, S1 index"], "i": [0, -1]}
    assert packed["labSheet"] == {"w": ["LAB-1, LAB-2"], "i": [0, -1]}
    assert packed["row"] == {"w": ["4, 9", "11"], "i": [0, 1]}
    assert packed["boring"] == {"w": ["BH-1"], "i": [0, 0]}
    assert (packed["top"], packed["base"]) == ([1, 3], [1.7, 3.5])


def test_whole_percents_of_one_bar_are_a_hundred_together(results: Results, data: dict[str, Any]) -> None:
    columns = [shares(data["steps"][f"p{k}"]) for k in range(len(SUITABILITY))]
    for at in range(STEPS):
        assert sum(column[at] for column in columns) == pytest.approx(1.0)
    for cell in range(STEPS * THICKNESSES):
        assert sum(odds_of(data, cell).values()) == pytest.approx(1.0)
    thirds = results.tables["subgrade"].assign(p_suitable=1 / 3, p_treat=1 / 3, p_unsuitable=1 / 3, p_not_assessed=0.0)
    steps = page_data(with_tables(results, subgrade=thirds))["steps"]
    assert [shares(steps[f"p{k}"])[0] for k in range(4)] == [0.34, 0.33, 0.33, 0.0]


def test_without_a_formation_nothing_is_judged_and_nothing_fails(results: Results) -> None:
    judged = ["formation_level_m", "cut_fill_m", "subgrade_material", "suitability", "soil_group", "probability"]
    table = schema.conform(results.tables["subgrade"].drop(columns=judged), schema.layers()["subgrade"])
    ground = results.tables["ground"].assign(formation_level_m=np.nan)
    data = page_data(with_tables(results, subgrade=table, ground=ground))
    assert set(data["steps"]["formation"]) == {None}
    assert data["summary"]["lengths"][:3] == [[0, 0, 0]] * 3


def test_two_borings_of_one_name_keep_their_samples_with_the_first(results: Results) -> None:
    borings = results.tables["borings"]
    twice = pd.concat([borings, borings.iloc[[0]].assign(status="left out")], ignore_index=True)
    assert page_data(with_tables(results, borings=twice))["samples"]["boring"][:4] == [0, 0, 0, 0]


def test_a_boring_without_coordinates_has_no_place_on_the_plan(results: Results) -> None:
    borings = results.tables["borings"].copy()
    geometry = borings["geometry"].to_numpy(object).copy()
    geometry[3] = None
    places = page_data(with_tables(results, borings=borings.assign(geometry=geometry)))["plan"]["borings"]
    assert places["lat"][3] is None
    assert None not in places["lat"][:3]


def test_the_line_has_a_vertex_at_every_step_boundary(data: dict[str, Any]) -> None:
    assert set(data["steps"]["from"]) | set(data["steps"]["to"]) <= set(data["plan"]["at"])
    assert len(data["plan"]["at"]) == len(data["plan"]["lat"]) == len(data["plan"]["lon"])


def test_the_plan_lies_where_the_projection_puts_it(results: Results, data: dict[str, Any]) -> None:
    """Constructed from the rule: UTM zone 30 has 500,000 m easting on the meridian of 3 degrees west."""
    to_degrees, local, note = degrees_from_projected("EPSG:32630")
    lon, lat = to_degrees(np.array([500_000.0]), np.array([0.0]))
    assert (lon[0], lat[0]) == pytest.approx((-3.0, 0.0), abs=1e-9)
    assert not local
    assert note == ""
    assert data["plan"]["lon"][0] == pytest.approx(-3.98, abs=0.01)


def test_a_missing_datum_grid_is_said_where_it_moves_the_plan() -> None:
    """The British National Grid needs a grid file that no Python package brings; PROJ then says the way is not best."""
    *_, note = degrees_from_projected("EPSG:27700")
    if not note:
        pytest.skip("the grid file is installed here")
    assert "approximate" in note
    assert "British National Grid" in note


def test_a_site_grid_without_a_place_on_the_globe_is_drawn_as_a_plane(results: Results) -> None:
    site = 'ENGCRS["site grid",EDATUM["peg 1"],CS[Cartesian,2],AXIS["x",east],AXIS["y",north],LENGTHUNIT["metre",1]]'
    plan = page_data(dataclasses.replace(results, crs=site))["plan"]
    assert plan["local"]
    assert "local coordinates" in plan["note"]
    assert plan["lon"][0] == pytest.approx(431_000.0)
    assert plan["lat"][0] == pytest.approx(5_623_000.0)


@pytest.mark.parametrize(("unit", "per_meter"), [("m", 1.0), ("ft", 1 / 0.3048), ("us-ft", 3937 / 1200)])
def test_lengths_are_shown_in_the_corridor_unit(unit: str, per_meter: float) -> None:
    """0.3048 m is the international foot of 1959, 1200/3937 m the US survey foot of 1893."""
    assert page_data(sample_results(length_unit=unit))["corridor"]["unit"]["perMeter"] == pytest.approx(per_meter)


def test_chainage_in_feet_counts_hundreds(results: Results) -> None:
    feet = dataclasses.replace(results, chainage_format="0+00", length_unit="us-ft")
    chainage = page_data(feet)["corridor"]["chainage"]
    assert chainage["digits"] == 2
    assert chainage["perMeter"] == pytest.approx(3937 / 1200)
    assert chainage["breaks"] == [[0.0, 12_000.0], [300.0, 12_350.0]]
