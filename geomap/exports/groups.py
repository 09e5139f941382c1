"""Which classification system names the soil groups of the layers, and what its symbols mean."""

from __future__ import annotations

from collections.abc import Mapping

from geomap.results import Results

# the column that holds the symbols of each system, in samples and in subgrade
SYMBOL_COLUMN = {"astm_d2487": "uscs_symbol", "aashto_m145": "aashto_group", "usda_texture": "usda_texture"}


def first_system(results: Results) -> str:
    """Return the system whose symbols stand in ``soil_group``: the first of the legend, as the corridor asks."""
    known = [name for name in results.legend["system"].unique() if name in SYMBOL_COLUMN]
    return known[0] if known else next(iter(SYMBOL_COLUMN))


def symbol_systems(results: Results) -> Mapping[str, str]:
    """Return, for each column that holds symbols, the system they belong to."""
    return {"soil_group": first_system(results), **{column: name for name, column in SYMBOL_COLUMN.items()}}


def symbol_names(results: Results, system: str) -> dict[str, str]:
    """Return symbol -> plain name of one system, in the order of its legend."""
    rows = results.legend.loc[results.legend["system"] == system].sort_values("order")
    return dict(zip(rows["symbol"].astype(str), rows["name"].astype(str), strict=True))
