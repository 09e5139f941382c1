"""Intake of field groups: what stands under ``visual_group`` must be a symbol to be used as one.

Sources: symbols of ASTM D2487-17, which ASTM D2488 gives by eye and hand; in D2488 a slash between two symbols marks
a borderline soil (from memory).
"""

from __future__ import annotations

import functools
import re
import tomllib
from collections.abc import Mapping
from importlib import resources

import numpy as np
import pandas as pd

from geomap.intake.entries import Intake
from geomap.intake.gathering import EVERY_SEVERITY, gathered
from geomap.tables.findings import Check

NO_SYMBOL, PAIR = "no symbol", "pair"

FIELD_WORD = Check(
    "field group is no symbol",
    "query",
    "a symbol of ASTM D2487, or blank",
    "kept as written but used as no group; write a symbol such as CL, and words under description",
)
BORDERLINE = Check(
    "field group of two symbols",
    "query",
    "a symbol of ASTM D2487, or blank",
    "kept as written but not used as one symbol; where there are no tests, write the likelier symbol",
)
_BETWEEN = re.compile("[/-]")


@functools.cache
def symbols() -> Mapping[str, str]:
    """Return the symbol of each accepted spelling, those of older texts too, from ``agreement.toml``.

    Examples
    --------
    >>> len(set(symbols().values())), symbols()["SP-SM"], symbols()["ML-CL"]
    (26, 'SP-SM', 'CL-ML')
    """
    table = tomllib.loads((resources.files("geomap.intake") / "agreement.toml").read_text("utf-8"))
    return {**{symbol: symbol for symbol in table["symbols"]}, **table["spellings"]}


def kinds(texts: pd.Series) -> pd.Series:
    """Return what each field group is: its symbol, ``pair`` for two symbols, or ``no symbol``; missing for a blank.

    Examples
    --------
    >>> kinds(pd.Series(["sp - sm", "GM-GC", "CL/CH", "Clay", None], dtype="string")).tolist()
    ['SP-SM', 'GC-GM', 'pair', 'no symbol', <NA>]
    """
    codes, uniques = pd.factorize(texts)
    judged = np.array([*(_kind(str(text)) for text in uniques), None], dtype=object)
    return pd.Series(judged[codes], texts.index, dtype="string")


def _kind(text: str) -> str | None:
    plain = "".join(text.split()).upper()
    if not plain:
        return None
    if plain in symbols():
        return symbols()[plain]
    return PAIR if all(part in symbols() for part in _BETWEEN.split(plain)) else NO_SYMBOL


def are_symbols(intake: Intake) -> Intake:
    """Ask about field groups of samples and strata that cannot be used as a symbol; each text once."""
    for table in ("samples", "strata"):
        if table in intake:
            entries = intake[table]
            kind = kinds(entries.rows["visual_group"])
            masks = {
                check: entries.used & (kind == name).fillna(False).to_numpy(dtype=bool)
                for name, check in ((NO_SYMBOL, FIELD_WORD), (PAIR, BORDERLINE))
            }
            parts = [entries.findings_of(check, mask, "visual_group") for check, mask in masks.items()]
            intake = intake.having(entries, gathered(parts, limit=1, severities=EVERY_SEVERITY))
    return intake


CHECKS = (are_symbols,)
