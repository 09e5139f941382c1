"""The words that a rule set may use: the columns that describe a soil, and the nearest word to a wrong one."""

from __future__ import annotations

import difflib
import functools
from collections.abc import Iterable, Mapping
from types import MappingProxyType

from geomap.tables import schema

# Percent passing these sizes is known of every soil, whatever sieves were run: limits of ASTM D2487, AASHTO M 145
# and the USDA texture triangle.
SIEVES_MM = (4.75, 2.0, 0.425, 0.075, 0.05, 0.002)

# Columns of the samples that say where a soil is, where its row was read, or what came of judging it. A rule on a
# place would be carried to other places with the soil.
_NOT_SOIL = {
    *schema.SOURCE_COLUMNS,
    *("boring", "sample", "top_depth_m", "base_depth_m", "distance_m", "chainage", "offset_m"),
    *("specimen", "specimen_basis", "gradation_basis", "lab_sheet", "status", "reason", "geometry"),
    *("subgrade_rating", "suitability", "suitability_reason", "rule"),
}


@functools.cache
def soil_columns() -> Mapping[str, schema.Column]:
    """Return the columns that a rule may look at, by name: those of the samples that describe a soil.

    Examples
    --------
    >>> [name in soil_columns() for name in ("liquid_limit_pct", "passing_0_075_mm_pct", "boring", "suitability")]
    [True, True, False, False]
    """
    names = dict.fromkeys([*schema.inputs()["samples"].columns, *schema.layers()["samples"].columns])
    found = {}
    for name in names:
        if name not in _NOT_SOIL:
            found[name] = schema.column(name)
            if found[name].censored:
                found[f"{name}_bound"] = schema.column(f"{name}_bound")
    found |= {name: schema.column(name) for name in map(schema.passing_column, SIEVES_MM)}
    return MappingProxyType(found)


def nearest_column(name: str) -> str | None:
    """Return the soil column that was probably meant, by its name or by a heading that is read as it.

    Examples
    --------
    >>> nearest_column("liquid_limit"), nearest_column("PI"), nearest_column("zzz")
    ('liquid_limit_pct', 'plasticity_index_pct', None)
    """
    words: dict[str, str] = {}
    for column in soil_columns().values():
        words |= dict.fromkeys((*column.aliases, column.name.replace("_", " ")), column.name)
    word = nearest(name.replace("_", " "), words)
    return words[word] if word else None


def nearest(word: str, choices: Iterable[str]) -> str | None:
    """Return the choice most like `word` in any case, or None where none is like it.

    Examples
    --------
    >>> nearest("top soil", ["natural", "topsoil"]), nearest("ch", ["CL", "CH"]), nearest("x", ["CL", "CH"])
    ('topsoil', 'CH', None)
    """
    folded = {choice.casefold(): choice for choice in choices}
    near = difflib.get_close_matches(word.casefold(), folded, n=1, cutoff=0.6)
    return folded[near[0]] if near else None
