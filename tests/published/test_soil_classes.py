"""Soil classes against published examples, and against cases constructed from the rules.

Every row of the CSV files is one check, with its source beside it. Where the answer printed in a source and the
standard differ, the standard's is asserted and the column ``agrees`` keeps the disagreement: ``no, name`` or
``no, rounding``; ``no answer printed`` and ``answer not seen`` are no evidence for geomap, only for this derivation.
``made_up`` says which inputs stand in for a result that the source states in words ("fines are clay").

- ``astm_d2487.csv``, ``aashto_m145.csv``: published examples
- ``classification_edges.csv``: constructed from the rules, one for each edge; ``unrounded_class`` is the class without
  rounding to whole numbers, and where it differs ``near_limit`` must say so
- ``astm_d2487_group_names.csv``: every symbol and group name of the figures, with a sample constructed to have it
- ``group_index.csv``, ``d_sizes.csv``, ``usda_texture.csv``: single quantities
"""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from geomap.soils.classification import classify_samples
from geomap.soils.gradation import curves_from_long
from geomap.soils.properties import properties
from geomap.soils.sieve_table import table_from_wide
from geomap.soils.systems import aashto_m145, astm_d2487, usda_texture
from geomap.soils.systems.aashto_m145_rules import thousandths
from tests.unit.soils.samples import FINES_IN_ZONE, samples_from

FOLDER = Path(__file__).parent


def read(name: str) -> list[pd.Series]:
    table = pd.read_csv(FOLDER / name, dtype=str, keep_default_na=False)
    return [row for _, row in table.iterrows()]


def ids(rows: list[pd.Series]) -> list[str]:
    return [f"{row['id']}" for row in rows]


D2487, M145, EDGES = read("astm_d2487.csv"), read("aashto_m145.csv"), read("classification_edges.csv")
NAMES, TEXTURES = read("astm_d2487_group_names.csv"), read("usda_texture.csv")
INDEXES, D_SIZES = read("group_index.csv"), read("d_sizes.csv")


def text(value: object) -> str:
    return "" if pd.isna(value) else str(value)


@pytest.mark.parametrize("row", D2487, ids=ids(D2487))
def test_an_example_has_the_symbol_and_name_of_the_standard(row: pd.Series) -> None:
    found = classify_samples(samples_from([row]), ["astm_d2487"]).iloc[0]
    assert text(found["uscs_symbol"]) == row["expected_symbol"], row["source"]
    assert found["uscs_symbol_basis"] == ("lab, fines by eye" if row["fines_by_eye"] else "lab")
    if row["expected_name"]:
        assert text(found["uscs_name"]) == row["expected_name"], row["source"]
    elif not row["p4"]:
        assert pd.isna(found["uscs_name"])
        assert "4.75 mm" in found["uscs_symbol_reason"]


@pytest.mark.parametrize("row", D2487, ids=ids(D2487))
def test_an_example_disagrees_with_its_source_only_where_the_row_says_so(row: pd.Series) -> None:
    found = classify_samples(samples_from([row]), ["astm_d2487"]).iloc[0]
    assert text(found["uscs_symbol"]) == row["published_symbol"] or row["agrees"] == "no answer printed"
    if row["published_name"] and row["expected_name"]:
        assert (text(found["uscs_name"]) == row["published_name"]) == (row["agrees"] != "no, name")


@pytest.mark.parametrize("row", M145, ids=ids(M145))
def test_an_example_has_the_group_and_index_of_the_standard(row: pd.Series) -> None:
    found = classify_samples(samples_from([row]), ["aashto_m145"]).iloc[0]
    assert text(found["aashto_group"]) == row["expected_group"], row["source"]
    assert text(found["group_index"]) == row["expected_index"], row["source"]
    if row["published_group"]:
        assert text(found["aashto_group"]) == row["published_group"]
    if row["published_index"]:
        assert (text(found["group_index"]) == row["published_index"]) == (row["agrees"] != "no, rounding")


@pytest.mark.parametrize("row", EDGES, ids=ids(EDGES))
def test_an_edge_falls_on_the_side_of_the_rule(row: pd.Series) -> None:
    found = classify_samples(samples_from([row]), [row["system"]]).iloc[0]
    if row["system"] == "astm_d2487":
        assert text(found["uscs_symbol"]) == row["expected_class"], row["shows"]
        assert text(found["uscs_name"]) == row["expected_name"], row["shows"]
        if row["unrounded_class"] != row["expected_class"]:
            assert found["uscs_symbol_near_limit"]
        assert row["expected_class"] or (found["uscs_symbol_reason"] and ";" in found["uscs_symbol_candidates"])
    else:
        assert text(found["aashto_group"]) == row["expected_class"], row["shows"]
        assert text(found["group_index"]) == row["expected_index"], row["shows"]


@pytest.mark.parametrize("row", NAMES, ids=[f"{row['symbol']}: {row['group_name']}" for row in NAMES])
def test_every_group_name_of_the_figures_is_reached(row: pd.Series) -> None:
    if row["symbol"] == "PT":
        sample = pd.DataFrame({"visual_group": ["PT"]})
    else:
        p4 = 100 - int(row["gravel"])
        sample = samples_from([{"p4": p4, "p200": row["fines"], **FINES_IN_ZONE.get(row["fines_zone"], {})}])
        well_graded = row["symbol"][1] == "W"
        sample["cu"], sample["cc"] = (20.0, 2.0) if well_graded else (2.0, 1.0)
        if row["symbol"] in ("OL", "OH"):
            sample["liquid_limit_oven_dried_pct"] = sample["liquid_limit_pct"] / 2
    found = classify_samples(sample, ["astm_d2487"]).iloc[0]
    assert found["uscs_symbol"] == row["symbol"]
    assert found["uscs_name"] == row["group_name"]


def test_the_table_of_names_holds_every_symbol() -> None:
    assert [row["symbol"] for row in NAMES if row["symbol"] not in astm_d2487.SYMBOLS] == []
    assert {row["symbol"] for row in NAMES} == set(astm_d2487.SYMBOLS)
    assert len(NAMES) == 108


@pytest.mark.parametrize("row", INDEXES, ids=lambda row: f"F {row['fines']}, PI {row['pi']}")
def test_the_group_index_has_the_value_of_the_standard_before_and_after_rounding(row: pd.Series) -> None:
    f, pi = float(row["fines"]), float(row["pi"])
    ll = float(row["ll"] or "nan")
    partial = row["partial"] == "1"
    raw = thousandths(np.array([f]), np.array([ll]), np.array([pi]), np.array([partial]))
    assert raw[0] / 1000 == pytest.approx(float(row["before_rounding"]), abs=1e-9)
    assert aashto_m145.group_index(f, ll, pi, partial) == float(row["reported"])


@pytest.mark.parametrize("row", D_SIZES, ids=lambda row: f"D{row['target']} of {row['points']}")
def test_a_d_size_lies_on_the_log_linear_curve(row: pd.Series) -> None:
    points = [point.split() for point in row["points"].split(";")]
    table = pd.DataFrame({"size_mm": [float(p[0]) for p in points], "passing_pct": [float(p[1]) for p in points]})
    found = curves_from_long(table, np.zeros(len(table), dtype=int), 1).size(float(row["target"]))
    assert found.size_mm[0] == pytest.approx(float(row["expected"]), abs=float(row["tolerance"]))


@pytest.mark.parametrize("row", TEXTURES, ids=lambda row: row["expected"])
def test_a_texture_is_that_of_the_triangle(row: pd.Series) -> None:
    sample = samples_from([{"p10": "100", "p50": 100 - int(row["sand"]), "p002": row["clay"]}])
    records = properties(sample, table_from_wide(sample))
    assert usda_texture.classify(records)["usda_texture"].tolist() == [row["expected"]]
