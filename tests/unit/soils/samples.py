"""Sample tables written the short way, for tests."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from typing import Any

import numpy as np
import pandas as pd

COLUMN = {
    "p75": "passing_75_mm_pct",
    "p4": "passing_4_75_mm_pct",
    "p10": "passing_2_mm_pct",
    "p40": "passing_0_425_mm_pct",
    "p200": "passing_0_075_mm_pct",
    "p50": "passing_0_05_mm_pct",
    "p002": "passing_0_002_mm_pct",
    "d10": "d10_mm",
    "d30": "d30_mm",
    "d60": "d60_mm",
    "cu": "cu",
    "cc": "cc",
    "ll": "liquid_limit_pct",
    "pl": "plastic_limit_pct",
    "pi": "plasticity_index_pct",
    "ll_oven": "liquid_limit_oven_dried_pct",
    "organic": "organic_pct",
    "cobbles": "cobbles_pct",
    "boulders": "boulders_pct",
}
VISUAL = {"silt": "ML", "clay": "CL", "": None}

# Limits well inside each zone of the plasticity chart; made up.
FINES_IN_ZONE: dict[str, dict[str, str]] = {
    "ML": {"ll": "40", "pl": "30"},
    "CL-ML": {"ll": "22", "pl": "16"},
    "CL": {"ll": "40", "pl": "20"},
    "MH": {"ll": "70", "pl": "45"},
    "CH": {"ll": "70", "pl": "28"},
}


def samples_from(rows: Iterable[Mapping[str, Any]]) -> pd.DataFrame:
    """Return rows with the keys of `COLUMN`, ``np``, ``visual`` and ``fines_by_eye`` as a table of samples.

    A blank is missing; the columns are typed as intake leaves them.
    """
    rows = [dict(row) for row in rows]
    table = pd.DataFrame(index=range(len(rows)))
    for short, name in COLUMN.items():
        cells = [row.get(short, "") for row in rows]
        values = [np.nan if cell in ("", None) else float(cell) for cell in cells]
        if not np.isnan(values).all() or short in ("p4", "p200"):
            table[name] = values
    table["is_nonplastic"] = pd.array([str(row.get("np", "")) in ("1", "True") for row in rows], dtype="boolean")
    visual = [row.get("visual") or VISUAL[row.get("fines_by_eye", "")] for row in rows]
    table["visual_group"] = pd.array(visual, dtype="string")
    return table
