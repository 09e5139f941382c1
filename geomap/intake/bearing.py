"""Intake of CBR: a value without its soak state, density or compaction method is held out of design.

The value stays in its column, with its finding; :func:`held_out` tells later stages which ones to leave aside.
"""

from __future__ import annotations

import dataclasses

import pandas as pd

from geomap.intake.entries import Intake
from geomap.tables.findings import Check

MOLDED = ("cbr_soaked_pct", "cbr_unsoaked_pct")  # specimens made in the laboratory, at a density that must be known
NO_SOAK_STATE = "cbr_pct"

SOAK_STATE_UNKNOWN = Check(
    "CBR without soak state",
    "hold_out",
    "a CBR under soaked, unsoaked or in place",
    "kept but held out of design; move it to the column for its soak state",
)
CONDITION_UNKNOWN = Check(
    "CBR without density or method",
    "hold_out",
    "a CBR with the density of its specimen and the compaction method",
    "",
)


def held_out(samples: pd.DataFrame) -> pd.DataFrame:
    """Return which CBR values of a samples table are held out of design.

    Parameters
    ----------
    samples
        Typed samples.

    Returns
    -------
    DataFrame
        Boolean, same index; columns ``cbr_soaked_pct``, ``cbr_unsoaked_pct`` and ``cbr_pct``.

    Examples
    --------
    >>> one = {"cbr_soaked_pct": [5.0, 4.0], "cbr_unsoaked_pct": [float("nan")] * 2, "cbr_pct": [float("nan"), 3.0]}
    >>> made = pd.DataFrame({**one, "cbr_density_pct": [95.0, 95.0], "compaction_method": ["T 99", None]})
    >>> held_out(made).values.tolist()
    [[False, False, False], [True, False, True]]
    """
    unknown = samples["cbr_density_pct"].isna() | samples["compaction_method"].isna()
    held = {column: samples[column].notna() & unknown for column in MOLDED}
    held[NO_SOAK_STATE] = samples[NO_SOAK_STATE].notna()
    return pd.DataFrame(held, samples.index).astype(bool)


def conditions(intake: Intake) -> Intake:
    """Hold out CBR values whose soak state, density or compaction method is not given."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    held = held_out(samples.rows)
    parts = [samples.findings_of(SOAK_STATE_UNKNOWN, held[NO_SOAK_STATE].to_numpy(dtype=bool), NO_SOAK_STATE)]
    no_density, no_method = samples.missing("cbr_density_pct"), samples.missing("compaction_method")
    lacking = {
        "the density of its specimen": no_density & ~no_method,
        "the compaction method": ~no_density & no_method,
        "the density of its specimen and the compaction method": no_density & no_method,
    }
    for column in MOLDED:
        for words, mask in lacking.items():
            check = dataclasses.replace(CONDITION_UNKNOWN, advice=f"kept but held out of design; give {words}")
            parts.append(samples.findings_of(check, held[column].to_numpy(dtype=bool) & mask, column))
    return intake.having(samples, *parts)


CHECKS = (conditions,)
