"""Soil records of a corridor: one for each specimen, and one for each logged layer.

What a hole logs as one layer is one soil until a sample says otherwise: the samples of a layer speak for all of its
depth, each for the part nearest to it, and a layer without samples speaks for itself with its visual group. So peat,
topsoil and made ground, which are seldom tested, still count, and a hole is never contradicted by distant ones.
"""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

UNKNOWN_DOMAIN = "|"


def middle_depth(table: pd.DataFrame) -> Floats:
    """Return the middle depth of each row [m]; a missing base is taken as the top."""
    top = table["top_depth_m"].to_numpy(float)
    base = table["base_depth_m"].to_numpy(float)
    return (top + np.where(np.isnan(base), top, base)) / 2


def covering(boring: pd.Series, depth: Floats, intervals: pd.DataFrame) -> Ints:
    """Return for each place the position of the interval that holds it, or -1; of several, the one that begins deepest.

    Parameters
    ----------
    boring, depth
        Name of the boring, and depth [m], of each place.
    intervals
        ``boring``, ``top_depth_m``, ``base_depth_m`` [m].
    """
    found = np.full(len(depth), -1, dtype=np.int64)
    if not len(intervals) or not len(depth):
        return found
    places = pd.DataFrame({"boring": boring.to_numpy(), "depth": depth, "place": np.arange(len(depth))})
    held = intervals[["boring", "top_depth_m", "base_depth_m"]].assign(interval=np.arange(len(intervals)))
    pairs = places.merge(held, on="boring").sort_values(["place", "top_depth_m", "interval"], kind="stable")
    pairs = pairs[(pairs["depth"] >= pairs["top_depth_m"]) & (pairs["depth"] <= pairs["base_depth_m"])]
    last = pairs.drop_duplicates("place", keep="last")
    found[last["place"].to_numpy(int)] = last["interval"].to_numpy(int)
    return found


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
    stratum = covering(samples["boring"], middle_depth(samples), strata)
    for name in ("visual_group", "origin", "unit"):
        taken = strata[name].reset_index(drop=True).reindex(stratum).set_axis(samples.index)
        result[name] = result[name].where(result[name].notna(), taken)
    return result


def layer_rows(strata: pd.DataFrame, samples: pd.DataFrame, first: int) -> pd.DataFrame:
    """Return the logged layers in the columns of `samples`, their index counting from `first`."""
    rows = strata.reindex(columns=samples.columns).astype(samples.dtypes)
    return rows.set_axis(pd.RangeIndex(first, first + len(strata)))


def one_per_specimen(soils: pd.DataFrame) -> pd.DataFrame:
    """Return one row for each specimen: its first row, over the depths of all its rows; the index is kept.

    Parameters
    ----------
    soils
        ``specimen``, ``top_depth_m``, ``base_depth_m`` and anything else that all rows of a specimen share.
    """
    base = soils["base_depth_m"].fillna(soils["top_depth_m"])
    top = soils["top_depth_m"].groupby(soils["specimen"], sort=False).transform("min")
    whole = soils.assign(top_depth_m=top, base_depth_m=base.groupby(soils["specimen"], sort=False).transform("max"))
    return whole.loc[~soils["specimen"].duplicated()]


def domains(soils: pd.DataFrame) -> pd.Series:
    """Return the domain of each row: origin and unit as one text, the same for soils that may vote for each other."""
    parts = [soils[name].fillna("").astype("string").str.strip().str.casefold() for name in ("origin", "unit")]
    return parts[0] + "|" + parts[1]


def agree(one: pd.Series, other: pd.Series) -> NDArray[np.bool_]:
    """Return whether two domains, row by row, can be one: what both state is the same."""
    result = np.ones(len(one), dtype=bool)
    for part in (0, 1):
        a, b = (side.str.split("|", n=1).str[part].to_numpy(object) for side in (one, other))
        result &= (a == b) | (a == "") | (b == "")
    return result
