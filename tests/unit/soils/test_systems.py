"""Single rules of the systems that tables of examples do not reach."""

from __future__ import annotations

import csv
from pathlib import Path
from types import ModuleType

import numpy as np
import pandas as pd
import pytest

from geomap.soils import precision
from geomap.soils.classification import classify_samples
from geomap.soils.records import arrays, as_given
from geomap.soils.systems import aashto_m145, astm_d2487, usda_texture
from geomap.soils.systems.aashto_m145 import group_index
from tests.unit.soils.samples import FINES_IN_ZONE, samples_from
from tests.unit.soils.test_against_plain_rules import records, samples

PUBLISHED = Path(__file__).parents[2] / "published"


def found(**cells: object) -> pd.Series:
    return classify_samples(samples_from([cells])).iloc[0]


def group_names() -> list[dict[str, str]]:
    with (PUBLISHED / "astm_d2487_group_names.csv").open(encoding="utf-8") as file:
        return [row for row in csv.DictReader(file) if row["condition"]]


def test_over_all_whole_compositions_a_name_is_the_one_whose_condition_holds() -> None:
    rows = group_names()
    compositions = [(g, s, 100 - g - s) for g in range(0, 101, 3) for s in range(0, 101 - g, 2)]
    for zone, limits in FINES_IN_ZONE.items():
        cells = [{"p4": 100 - g, "p200": f, "cu": 10, "cc": 2, **limits} for g, _, f in compositions]
        classes = classify_samples(samples_from(cells), ["astm_d2487"])
        for (gravel, sand, fines), symbol, name in zip(
            compositions, classes["uscs_symbol"], classes["uscs_name"], strict=True
        ):
            held = {"gravel": gravel, "sand": sand, "coarse": 100 - fines}
            silty_clay = zone == "CL-ML" and symbol[:3] in ("GW-", "SW-")
            names = [
                row["group_name"]
                for row in rows
                if row["symbol"] == symbol
                and ("silty clay" in row["group_name"]) == (silty_clay or symbol == "CL-ML")
                and eval(row["condition"].replace(";", " and"), {}, held)  # noqa: S307 - our own file
            ]
            assert names == [name], (gravel, sand, fines, zone)


@pytest.mark.parametrize(
    ("ratio", "expected"),
    [(1.45, "SP-SM"), (1.41, "SP-SM"), (1.3, "SP-SM"), (2.0, None)],
)
def test_a_curve_steep_between_d30_and_d60_is_poorly_graded_whatever_d10_is(ratio: float, expected: str | None) -> None:
    # Cc = Cu (D30/D60)^2, so Cu >= 6 and Cc <= 3 need D60/D30 >= sqrt 2; at 1.45 D10 would have to be 0.0706 to 0.0704.
    d60 = 0.3
    cells = {"p4": 100, "p200": 11, "np": 1, "d30": d60 / ratio, "d60": d60}
    symbol = found(**cells)["uscs_symbol"]
    if ratio == 1.45:
        assert pd.isna(symbol)  # Cu 6 to 6.3 would do, so it stays open
    elif expected:
        assert symbol == expected
    else:
        assert pd.isna(symbol)


def test_cu_alone_may_prove_poorly_graded_but_never_well_graded() -> None:
    records = pd.DataFrame({"cu": [5.0, np.nan, 8.0], "cc": [np.nan, 3.2, np.nan]})
    records[["passing_4_75_mm_pct", "passing_0_075_mm_pct"]] = 100.0, 3.0
    found = astm_d2487.classify(records)
    assert found["uscs_symbol"].astype(object).fillna("").tolist() == ["SP", "SP", ""]
    assert found["uscs_symbol_candidates"].astype(object).fillna("").tolist() == ["", "", "SW;SP"]


def test_a_finer_sieve_can_prove_sand_without_the_no_4() -> None:
    row = found(p10=90, p200=20, ll=40, pl=20)
    assert (row["uscs_symbol"], row["uscs_name"]) == ("SC", "clayey sand")
    row = found(p10=70, p200=20, ll=40, pl=20)
    assert row["uscs_symbol"] == "SC"
    assert pd.isna(row["uscs_name"])


def test_the_visual_estimate_decides_only_from_5_to_12_percent_fines() -> None:
    assert found(p4=100, p200=8, cu=10, cc=2, visual="SM")["uscs_symbol"] == "SW-SM"
    assert found(p4=100, p200=8, cu=10, cc=2, visual="SW")["uscs_symbol_candidates"] == "SW-SM;SW-SC"
    assert pd.isna(found(p4=100, p200=20, visual="SM")["uscs_symbol"])
    assert found(p4=100, p200=8, cu=10, cc=2, ll=40, pl=20, visual="SM")["uscs_symbol"] == "SW-SC"


def test_a_visual_group_among_the_candidates_is_not_promoted() -> None:
    row = found(p4=100, p200=60, ll=40, visual="CL")
    assert pd.isna(row["uscs_symbol"])
    assert row["uscs_symbol_candidates"] == "CL;ML"


def test_nonplastic_soil_with_a_high_liquid_limit_is_placed_by_it() -> None:
    assert found(p4=100, p200=90, ll=60, np=1)["uscs_symbol"] == "MH"
    row = found(p4=100, p10=100, p40=100, p200=90, ll=60, np=1)
    assert (row["aashto_group"], row["group_index"]) == ("A-5", 9)  # 0.005*60*55 - 0.01*75*10 = 9.0


@pytest.mark.parametrize(
    ("cells", "symbols"),
    [
        ({"p200": 90, "p4": 100, "ll_oven": 30}, "CL;CL-ML;ML;CH;MH;OL;OH"),
        ({"p200": 90, "p4": 100, "ll": 45, "ll_oven": 30}, None),
        ({"p200": 90, "p4": 100, "ll_oven": 30, "np": 1}, None),
    ],
)
def test_oven_drying_tells_organic_only_beside_the_other_limit(cells: dict[str, object], symbols: str | None) -> None:
    row = found(**cells)
    if symbols:
        assert row["uscs_symbol_candidates"] == symbols
    elif "ll" in cells:
        assert row["uscs_symbol"] == "OL"
        assert pd.isna(row["uscs_name"])
        assert "plasticity index" in row["uscs_symbol_reason"]
    else:
        assert row["uscs_symbol"] == "ML"
        assert "taken as inorganic" in row["uscs_symbol_reason"]


def test_the_group_index_takes_arrays_and_leaves_missing_ones_missing() -> None:
    found_index = group_index(
        [55, np.nan, 30.4, 45], [40, 40, np.nan, 50], [25, 20, 30, 10], [False, False, True, False]
    )
    assert found_index == pytest.approx([10, np.nan, 3, 3], nan_ok=True)
    assert np.isnan(group_index(55, np.nan, 25))


@pytest.mark.parametrize(
    ("cells", "group", "index"),
    [
        ({"p200": 12, "p40": 30, "p10": 60, "ll": 30}, None, "0"),  # PI open: A-1-b, A-2-4 or A-2-6, index 0 in all
        ({"p200": 15, "ll": 30, "pl": 10}, "A-2-6", "0"),
        ({"p200": 30, "pi": 30}, None, "3"),  # A-2-6 or A-2-7: the plasticity term needs no liquid limit
        ({"p200": 30, "ll": 30}, None, None),
        ({"p200": 60, "pi": 20}, None, None),
        ({"p200": 60, "ll": 30}, None, None),
        ({"ll": 30, "pl": 10}, None, None),
    ],
)
def test_the_group_index_needs_other_data_than_the_group(
    cells: dict[str, object], group: str | None, index: str | None
) -> None:
    row = found(**cells)
    assert (None if pd.isna(row["aashto_group"]) else row["aashto_group"]) == group
    assert (None if pd.isna(row["group_index"]) else str(row["group_index"])) == index


def test_textures_tile_the_triangle_without_gap_or_overlap() -> None:
    half = np.arange(201) / 2
    sand, clay = (part.ravel() for part in np.meshgrid(half, half))
    inside = sand + clay <= 100
    sand, clay = sand[inside], clay[inside]
    assert (usda_texture.texture(sand, clay) > 0).all()
    silt = 100 - sand - clay
    # Overlap would show as a code that depends on the order of the classes: written out once more, in reverse.
    again = np.zeros(len(sand), dtype=np.int8)
    for code, holds in reversed(list(enumerate(triangle(sand, silt, clay), start=1))):
        again[holds] = code
    assert (usda_texture.texture(sand, clay) == again).all()
    assert (np.sum(triangle(sand, silt, clay), axis=0) == 1).all()


def triangle(sand: np.ndarray, silt: np.ndarray, clay: np.ndarray) -> list[np.ndarray]:
    """Return the class limits of the Soil Survey Manual, in the order of the symbols."""
    low_clay, mid_clay = clay < 7, (clay >= 7) & (clay < 20)
    return [
        (sand > 85) & (silt + 1.5 * clay < 15),
        (sand >= 70) & (sand <= 91) & (silt + 1.5 * clay >= 15) & (silt + 2 * clay < 30),
        (silt + 2 * clay >= 30) & ((mid_clay & (sand > 52)) | (low_clay & (silt < 50) & (sand > 43))),
        (clay >= 7) & (clay < 27) & (silt >= 28) & (silt < 50) & (sand <= 52),
        (silt >= 50) & (clay < 27) & ~((silt >= 80) & (clay < 12)),
        (silt >= 80) & (clay < 12),
        (clay >= 20) & (clay < 35) & (silt < 28) & (sand > 45),
        (clay >= 27) & (clay < 40) & (sand > 20) & (sand <= 45),
        (clay >= 27) & (clay < 40) & (sand <= 20),
        (clay >= 35) & (sand > 45),
        (clay >= 40) & (silt >= 40),
        (clay >= 40) & (sand <= 45) & (silt < 40),
    ]


@pytest.mark.parametrize(
    ("cells", "texture", "reason"),
    [
        ({"p10": 100, "p200": 3}, "sand", None),  # no hydrometer needed: 97 % sand at least
        ({"p10": 100, "p200": 60}, None, "hydrometer"),
        ({"p10": 80, "p50": 90, "p002": 10}, None, "no usable laboratory tests"),
        ({"p10": 0, "p50": 0, "p002": 0}, None, "nothing passes 2 mm"),
        ({"ll": 30}, None, "no usable laboratory tests"),
    ],
)
def test_a_texture_is_given_where_the_sizes_decide_and_else_a_reason(
    cells: dict[str, object], texture: str | None, reason: str | None
) -> None:
    row = classify_samples(samples_from([cells]), ["usda_texture"]).iloc[0]
    assert (None if pd.isna(row["usda_texture"]) else row["usda_texture"]) == texture
    assert (reason in row["usda_texture_reason"]) if reason else pd.isna(row["usda_texture_reason"])


def test_textures_left_by_a_missing_size_hold_every_texture_it_can_give() -> None:
    draw = np.random.default_rng(5)
    cells = []
    for _ in range(300):
        p002, p50, p200, p10 = np.sort(draw.integers(0, 101, 4))
        cells.append({"p10": max(p10, 1), "p200": p200, "p50": p50, "p002": p002})
    full = samples_from(cells)
    expected = usda_texture.classify(full)["usda_texture"].astype(object)
    for gap in ("p10", "p50", "p002"):
        short = samples_from([{k: v for k, v in cell.items() if k != gap} for cell in cells])
        row = usda_texture.classify(short)
        texture, left = row["usda_texture"].astype(object), row["usda_texture_candidates"].astype(object)
        decided = texture.notna()
        assert (texture[decided] == expected[decided]).all()
        listed = left[~decided & left.notna()]
        assert len(listed)
        assert all(expected[k] in text.split(";") for k, text in listed.items())


@pytest.mark.parametrize("system", [astm_d2487, aashto_m145], ids=lambda system: system.NAME)
def test_only_records_that_a_move_cannot_change_are_spared_it(system: ModuleType) -> None:
    table, judge = records(samples(4000, seed=6)), system._tested_codes
    columns = (
        {**system.read(table), **arrays(table, ("d10_mm", *astm_d2487.D_SIZE_ENDS))}
        if system is astm_d2487
        else arrays(table, system.NEEDS)
    )
    codes = system.codes({name: columns[name] for name in system.NEEDS})
    moves = system._moves(columns)
    spared = precision.near_limit(columns, codes, moves, judge)
    everywhere = [precision.Move(move.name, np.ones(len(table), dtype=bool), move.variants) for move in moves]
    assert (precision.near_limit(columns, codes, everywhere, judge) == spared).all()
    assert 0 < spared.mean() < 1
    assert (judge(columns, as_given)[~spared] == codes[~spared]).all()
