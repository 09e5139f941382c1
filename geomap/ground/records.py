"""Soil records of a corridor: one for each specimen, and one for each logged layer that nobody sampled.

A record that comes from the log alone carries its visual group, origin and unit; so peat, topsoil and made ground,
which are seldom tested, still count.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

UNKNOWN_DOMAIN = ""


def covering_stratum(samples: pd.DataFrame, strata: pd.DataFrame) -> NDArray[np.int64]:
    """Return for each sample the position of the stratum that holds its middle depth, or -1.

    Parameters
    ----------
    samples
        ``boring``, ``top_depth_m``, ``base_depth_m`` [m]; a missing base is taken as the top.
    strata
        ``boring``, ``top_depth_m``, ``base_depth_m`` [m]. Where two overlap, the one that begins deeper.
    """
    found = np.full(len(samples), -1, dtype=np.int64)
    if not len(strata) or not len(samples):
        return found
    left = pd.DataFrame(
        {"boring": samples["boring"].to_numpy(), "depth": middle_depth(samples), "at": range(len(samples))}
    )
    right = pd.DataFrame(
        {
            "boring": strata["boring"].to_numpy(),
            "depth": strata["top_depth_m"].to_numpy(),
            "base": strata["base_depth_m"].to_numpy(),
            "stratum": range(len(strata)),
        }
    )
    left, right = (t.dropna(subset=["boring", "depth"]).sort_values("depth", kind="stable") for t in (left, right))
    joined = pd.merge_asof(left, right, on="depth", by="boring")
    inside = joined[joined["depth"] <= joined["base"]]
    found[inside["at"].to_numpy(int)] = inside["stratum"].to_numpy(int)
    return found


def middle_depth(table: pd.DataFrame) -> NDArray[np.float64]:
    """Return the middle depth of each row [m]; a missing base is taken as the top."""
    top = table["top_depth_m"].to_numpy(float)
    base = table["base_depth_m"].to_numpy(float)
    return (top + np.where(np.isnan(base), top, base)) / 2


def with_log(samples: pd.DataFrame, strata: pd.DataFrame) -> pd.DataFrame:
    """Return the samples; where one says nothing of its visual group, origin or unit, it takes its layer's.

    Parameters
    ----------
    samples, strata
        Tables in the layouts of the same names.
    """
    result = samples.copy()
    if not len(strata):
        return result
    stratum = covering_stratum(samples, strata)
    for name in ("visual_group", "origin", "unit"):
        taken = strata[name].reset_index(drop=True).reindex(stratum).set_axis(samples.index)
        result[name] = result[name].where(result[name].notna(), taken)
    return result


def bare_layers(samples: pd.DataFrame, strata: pd.DataFrame) -> pd.DataFrame:
    """Return the logged layers in which there is no sample, in the columns of `samples`; their index follows on."""
    bare = strata.iloc[np.setdiff1d(np.arange(len(strata)), covering_stratum(samples, strata))]
    first = int(samples.index.max()) + 1 if len(samples) else 0
    return bare.reindex(columns=samples.columns).set_axis(pd.RangeIndex(first, first + len(bare)))


def one_per_specimen(soils: pd.DataFrame) -> pd.DataFrame:
    """Return one row for each specimen: its first row, over the depths of all its rows; the index is kept.

    Parameters
    ----------
    soils
        ``specimen``, ``top_depth_m``, ``base_depth_m`` and anything else.
    """
    groups = soils.groupby("specimen", sort=False)
    base = soils["base_depth_m"].fillna(soils["top_depth_m"]).groupby(soils["specimen"]).transform("max")
    whole = soils.assign(top_depth_m=groups["top_depth_m"].transform("min"), base_depth_m=base)
    return whole.loc[~soils["specimen"].duplicated()]


def domains(soils: pd.DataFrame) -> pd.Series:
    """Return the domain of each row: origin and unit joined, the same text for soils that may vote for each other."""
    origin = soils["origin"].fillna("").astype("string")
    unit = soils["unit"].fillna("").astype("string")
    joined = origin + "|" + unit
    return joined.where(joined != "|", UNKNOWN_DOMAIN)


def voters(domain: pd.Series, has_answer: NDArray[np.bool_]) -> NDArray[np.bool_]:
    """Return which records vote: those with a group or a verdict, and all records of a domain that has neither.

    A record without any answer would only dilute the others; where a domain has nothing else, it stands for the
    domain, and the answer there is "not determined".
    """
    answered = pd.Series(has_answer, index=domain.index)
    return (answered | ~answered.groupby(domain).transform("any")).to_numpy(bool)
