"""Where each record speaks: specimens and logged layers cut into points of about one thickness."""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.ground import records


def voices(
    specimens: pd.DataFrame, layers: pd.DataFrame, is_answered: NDArray[np.bool_], thickness_m: float
) -> pd.DataFrame:
    """Return the points at which records speak.

    A specimen speaks over its own depths. The rest of a logged layer belongs to the nearest specimen in it that has
    an answer and does not contradict the layer's origin or unit; where there is none, to the layer itself.

    Parameters
    ----------
    specimens, layers
        ``boring``, ``distance_m``, ``offset_m``, ``top_depth_m``, ``base_depth_m``, ``origin``, ``unit``.
    is_answered
        For each specimen, whether it has a class or a verdict.
    thickness_m
        About the height of a piece [m].

    Returns
    -------
    DataFrame
        ``boring``, ``distance_m``, ``offset_m``, ``depth_m``, ``domain``, and ``record``: position in the specimens
        followed by the layers.
    """
    own = _pieces(specimens, thickness_m).assign(domain=records.domains, record=lambda t: t["interval"])
    logged = _pieces(layers, thickness_m)
    depth = logged["depth_m"].to_numpy(float)
    inside = records.covering(logged["boring"], depth, layers) == logged["interval"].to_numpy()
    inside &= records.covering(logged["boring"], depth, specimens) < 0
    logged = logged[inside].reset_index(drop=True)
    logged["domain"] = records.domains(logged)
    logged["record"] = logged["interval"] + len(specimens)
    taken = _nearest_specimen(specimens[is_answered], np.flatnonzero(is_answered), layers, logged)
    logged.loc[taken.index, "record"] = taken["record"]
    logged.loc[taken.index, "domain"] = taken["domain"]
    names = ["boring", "distance_m", "offset_m", "depth_m", "domain", "record"]
    spoken: pd.DataFrame = pd.concat([own[names], logged[names]], ignore_index=True)
    return spoken


def _pieces(intervals: pd.DataFrame, thickness_m: float) -> pd.DataFrame:
    """Cut intervals into pieces of about one thickness; a point stays one piece. ``interval`` is the position."""
    top = intervals["top_depth_m"].to_numpy(float)
    base = np.fmax(intervals["base_depth_m"].to_numpy(float), top)
    count = np.maximum(1, np.round((base - top) / thickness_m)).astype(int)
    which = np.repeat(np.arange(len(intervals)), count)
    number = np.arange(len(which)) - np.repeat(np.cumsum(count) - count, count)
    depth = top[which] + (number + 0.5) * ((base - top) / count)[which]
    return intervals.iloc[which].reset_index(drop=True).assign(depth_m=depth, interval=which)


def _nearest_specimen(
    specimens: pd.DataFrame, positions: NDArray[np.int64], layers: pd.DataFrame, pieces: pd.DataFrame
) -> pd.DataFrame:
    """Return, on the index of the pieces that have one, the nearest specimen of their layer and its domain."""
    depth = records.middle_depth(specimens)
    of_layer = records.covering(specimens["boring"], depth, layers)
    within = pd.DataFrame(
        {
            "interval": of_layer,
            "specimen_depth": depth,
            "specimen_domain": records.domains(specimens).to_numpy(object),
            "specimen_record": positions,
        }
    )
    pairs = pieces.reset_index(names="piece").merge(within[of_layer >= 0], on="interval")
    pairs = pairs[records.agree(pairs["domain"].astype("string"), pairs["specimen_domain"].astype("string"))]
    pairs["gap"] = (pairs["depth_m"] - pairs["specimen_depth"]).abs()
    nearest = pairs.sort_values(["piece", "gap", "specimen_record"], kind="stable").drop_duplicates("piece")
    chosen = nearest.set_index("piece")[["specimen_record", "specimen_domain"]]
    return chosen.rename(columns={"specimen_record": "record", "specimen_domain": "domain"})
