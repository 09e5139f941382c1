"""Steps of the alignment merged into stretches with one answer, for the subgrade schedule."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
import pandas as pd
from numpy.typing import NDArray

_SAME = ("subgrade_material", "soil_group", "aashto_group", "suitability", "evidence", "rule")
_TOUCHING_M = 0.001  # a gap longer than this starts a new stretch

# heading -> (column of the subgrade layer, how the steps are joined)
_COLUMNS: Mapping[str, tuple[str, str]] = {
    "From chainage": ("from_chainage", "first"),
    "To chainage": ("to_chainage", "last"),
    "From (m)": ("from_distance_m", "first"),
    "To (m)": ("to_distance_m", "last"),
    "Length (m)": ("length_m", "sum"),
    "Subgrade material": ("subgrade_material", "first"),
    "Cut or fill, lowest (m)": ("cut_fill_m", "min"),
    "Cut or fill, highest (m)": ("cut_fill_m", "max"),
    "Soil group": ("soil_group", "first"),
    "Probability, lowest": ("probability", "min"),
    "Probability, highest": ("probability", "max"),
    "AASHTO group": ("aashto_group", "first"),
    "Suitability": ("suitability", "first"),
    "P unsuitable, highest": ("p_unsuitable", "max"),
    "CBR mid, lowest (%)": ("cbr_mid_pct", "min"),
    "CBR mid, highest (%)": ("cbr_mid_pct", "max"),
    "Evidence": ("evidence", "first"),
    "Nearest borings": ("nearest_boring", "names"),
    "Rule": ("rule", "first"),
}


def stretches(subgrade: pd.DataFrame) -> pd.DataFrame:
    """Return one row for each run of steps with the same soil, verdict, material, evidence and rule.

    A chainage equation at the end of a step starts a new stretch, because the labels at its ends could no longer
    be subtracted. Probabilities and cut or fill are given as the range of the steps.

    Parameters
    ----------
    subgrade
        The subgrade layer, lengths in meters, in any order.

    Returns
    -------
    DataFrame
        Headings for people; lengths in meters. Every step is in exactly one stretch.
    """
    steps = subgrade.sort_values("from_distance_m", kind="stable").reset_index(drop=True)
    steps = steps.assign(length_m=steps["to_distance_m"] - steps["from_distance_m"])
    groups = steps.groupby(np.cumsum(_starts(steps)), sort=False)
    joined = {
        heading: groups[column].agg(_names if how == "names" else how) for heading, (column, how) in _COLUMNS.items()
    }
    return pd.DataFrame(joined).reset_index(drop=True)


def _starts(steps: pd.DataFrame) -> NDArray[np.bool_]:
    """Tell for each step whether a new stretch starts with it."""
    texts = steps[[*_SAME, "from_chainage", "to_chainage"]].astype("object").fillna("").to_numpy(dtype=object)
    answers, from_chainage, to_chainage = texts[:, : len(_SAME)], texts[:, -2], texts[:, -1]
    start, end = (steps[name].to_numpy(float) for name in ("from_distance_m", "to_distance_m"))
    starts = np.ones(len(steps), dtype=bool)
    starts[1:] = (answers[1:] != answers[:-1]).any(axis=1)
    starts[1:] |= np.abs(start[1:] - end[:-1]) > _TOUCHING_M
    starts[1:] |= from_chainage[1:] != to_chainage[:-1]
    return starts


def _names(values: pd.Series) -> str:
    """Return different names in the order met, with commas."""
    return ", ".join(dict.fromkeys(values.dropna().astype(str)))
