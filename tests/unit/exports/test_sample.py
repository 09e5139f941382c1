"""The invented corridor keeps the contract that exports rely on."""

from __future__ import annotations

import json

import numpy as np
import pytest

from geomap.results import Results
from geomap.tables import schema


@pytest.mark.parametrize("layer", schema.layers())
def test_every_layer_has_the_columns_of_its_layout(results: Results, layer: str) -> None:
    layout = schema.layers()[layer]
    table = results.tables[layer]
    assert set(layout.columns) <= set(table.columns)
    assert ("geometry" in table.columns) == (layout.geometry is not None)
    if layout.key:
        assert not table.duplicated(list(layout.key)).any()


def test_the_four_shares_of_a_step_are_those_of_its_draws_and_add_to_one(results: Results) -> None:
    subgrade = results.tables["subgrade"]
    legend = results.legend.loc[results.legend["system"] == "suitability"]
    for code, symbol in zip(legend["code"], legend["symbol"], strict=True):
        share = (results.draws == code).mean(axis=1)
        np.testing.assert_allclose(subgrade[f"p_{symbol.replace(' ', '_')}"], share)
    np.testing.assert_allclose(subgrade.filter(like="p_").sum(axis=1), 1.0)


def test_odds_name_known_symbols_and_add_to_one(results: Results) -> None:
    known = set(results.symbols("astm_d2487"))
    for text in results.tables["profile_cells"]["astm_d2487_odds"]:
        odds = json.loads(text)
        assert set(odds) <= known
        assert sum(odds.values()) == pytest.approx(1.0, abs=0.01)
