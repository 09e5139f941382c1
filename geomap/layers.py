"""The layers of the results, laid out from what the stages found; and the record of the run.

Nothing is judged or estimated here: columns are chosen, places are labeled, geometry is attached.
"""

from __future__ import annotations

import platform
from collections.abc import Callable, Mapping, Sequence
from importlib import metadata

import numpy as np
import pandas as pd
import shapely
from numpy.typing import NDArray

from geomap.corridor import Corridor
from geomap.results import CAUTIONS
from geomap.tables import schema

Label = Callable[[NDArray[np.float64]], Sequence[str]]
LIBRARIES = ("numpy", "scipy", "pandas", "shapely", "pyproj", "geopandas", "pyogrio", "folium")


def layer(name: str, frame: pd.DataFrame) -> pd.DataFrame:
    """Return `frame` in the layout of an output layer, on a fresh index."""
    return schema.conform(frame.reset_index(drop=True), schema.layers()[name])


def with_points(frame: pd.DataFrame) -> pd.DataFrame:
    """Return `frame` with a point for each row that has a place, and none for the others."""
    x, y = (frame[name].to_numpy(float) for name in ("x", "y"))
    placed = np.isfinite(x) & np.isfinite(y)
    geometry = np.full(len(frame), None, dtype=object)
    geometry[placed] = shapely.points(x[placed], y[placed])
    return frame.assign(geometry=geometry)


def with_labels(frame: pd.DataFrame, label: Label, names: Mapping[str, str]) -> pd.DataFrame:
    """Return `frame` with a chainage label for each distance; `names` maps distance column to chainage column."""
    result = frame.copy()
    for distance, chainage in names.items():
        known = frame[distance].notna().to_numpy()
        texts = np.full(len(frame), None, dtype=object)
        texts[known] = label(frame[distance].to_numpy(float)[known])
        result[chainage] = pd.Series(texts, index=frame.index, dtype="string")
    return result


def alignment(
    corridor: Corridor, line: NDArray[np.float64], length_m: float, ground: pd.DataFrame, label: Label
) -> pd.DataFrame:
    """Return the layer ``alignment``.

    Parameters
    ----------
    corridor
        Names the line.
    line
        Vertices in distance, x, y, shape (vertices, 3).
    length_m
        Length along the line [m].
    ground
        ``distance_m`` and ``ground_level_m`` by step; levels are missing where they are not known.
    label
        Chainage labels of distances.
    """
    level = ground["ground_level_m"].to_numpy(float)
    known = np.isfinite(level)
    vertices = line[:, 1:]
    if known.any():
        z = np.interp(line[:, 0], ground["distance_m"].to_numpy(float)[known], level[known])
        vertices = np.column_stack([vertices, z])
    row = {"name": corridor.corridor.name, "start_chainage": label(np.zeros(1))[0], "length_m": length_m}
    return layer("alignment", pd.DataFrame([row]).assign(geometry=[shapely.linestrings(vertices)]))


def legend(systems: Mapping[str, Mapping[str, str]], verdicts: Sequence[str]) -> pd.DataFrame:
    """Return the legend: system, code, symbol, name, order.

    Parameters
    ----------
    systems
        By system: name of each symbol, in the order of the codes from 1. Code 0 is ``n/d``, not determined.
    verdicts
        Words of the verdicts in the order of their codes.
    """
    rows = [
        (system, code, symbol, name)
        for system, names in systems.items()
        for code, (symbol, name) in enumerate({"n/d": "not determined", **names}.items())
    ]
    rows += [("suitability", code, word, word) for code, word in enumerate(verdicts)]
    table = pd.DataFrame(rows, columns=["system", "code", "symbol", "name"])
    # What is not determined comes last in a legend, whatever its code.
    table["order"] = table["code"].where(table["symbol"] != "n/d", 10_000)
    return table


def run_record(
    corridor: Corridor, fingerprints: Mapping[str, str], sources: Mapping[str, str], subgrade: pd.DataFrame
) -> pd.DataFrame:
    """Return the layer ``run``: versions, inputs, standards and rule sets with editions, parameters and totals.

    Parameters
    ----------
    corridor
        The corridor file as read.
    fingerprints
        SHA-256 of every input file by name.
    sources
        Further entries: standards, rule sets and what the estimate rests on.
    subgrade
        The layer of that name, for the totals.
    """
    about = corridor.corridor
    rows: dict[str, object] = {
        "geomap version": metadata.version("geomap"),
        "python version": platform.python_version(),
        **{f"{library} version": metadata.version(library) for library in LIBRARIES},
        **{f"corridor {key}": value for key, value in about if value not in ("", None)},
        **{f"sha256 {name}": digest for name, digest in fingerprints.items()},
        **sources,
        **{f"subgrade {key}": value for key, value in corridor.subgrade},
        **{f"profile {key}": value for key, value in corridor.profile},
        "realizations": corridor.estimation.realizations,
        "seed": corridor.estimation.seed,
        **totals(subgrade),
        **{f"caution {number}": text for number, text in enumerate(CAUTIONS, 1)},
    }
    texts = [", ".join(map(str, v)) if isinstance(v, list) else str(v) for v in rows.values()]
    return layer("run", pd.DataFrame({"key": list(rows), "value": texts}))


def totals(subgrade: pd.DataFrame) -> dict[str, str]:
    """Return lengths of the line by suitability and by evidence [m], as text with one decimal."""
    length = (subgrade["to_distance_m"] - subgrade["from_distance_m"]).to_numpy(float)
    found = {"length_m": f"{length.sum():.1f}"}
    for column in ("suitability", "evidence", "subgrade_material"):
        for word in schema.column(column).choices:
            share = length[(subgrade[column] == word).to_numpy(bool, na_value=False)].sum()
            found[f"length_{word.replace(' ', '_')}_m"] = f"{share:.1f}"
    return found
