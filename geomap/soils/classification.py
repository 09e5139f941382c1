"""Classification of records and of samples already in memory, by any of the systems."""

from __future__ import annotations

from collections.abc import Iterable

import pandas as pd

from geomap.errors import UsageError, problem
from geomap.soils import gradation, properties
from geomap.soils.sieve_table import table_from_wide
from geomap.soils.systems import SYSTEMS, System

ASTM_AND_AASHTO = ("astm_d2487", "aashto_m145")


def systems_named(names: Iterable[str]) -> list[System]:
    """Return classification systems by name.

    Raises
    ------
    UsageError
        There is no system of that name; the text lists those there are.
    """
    known = {system.NAME: system for system in SYSTEMS}
    for name in names:
        if name not in known:
            raise UsageError(problem("systems", name, ", ".join(known), "choose one of these"))
    return [known[name] for name in names]


def classify(
    records: pd.DataFrame, systems: Iterable[str] = ASTM_AND_AASHTO, *, with_reasons: bool = True
) -> pd.DataFrame:
    """Return the classes of records by several systems, side by side, on the same index.

    Parameters
    ----------
    records
        As from `geomap.soils.properties.describe`; an absent column was not tested.
    systems
        Names of systems, see `geomap.soils.systems.SYSTEMS`.
    with_reasons
        Add the columns ``_reason`` and ``_candidates`` of each system.

    Raises
    ------
    UsageError
        There is no system of that name.
    """
    found = [system.classify(records, with_reasons=with_reasons) for system in systems_named(tuple(systems))]
    return pd.concat([pd.DataFrame(index=records.index), *found], axis=1)


def classify_samples(
    samples: pd.DataFrame,
    systems: Iterable[str] = ASTM_AND_AASHTO,
    *,
    gradations: pd.DataFrame | None = None,
    organic_limit_pct: float | None = None,
    with_reasons: bool = True,
) -> pd.DataFrame:
    """Return the classes of samples that are already in memory, one row for each, on the same index.

    Each row is taken as a specimen of its own; rows are not joined (`geomap.soils.specimens` does that).

    Parameters
    ----------
    samples
        Typed columns of the layout ``samples`` under their names in geomap, with percent passing in columns of the
        passing family; an absent column was not tested, NaN is missing.
    systems
        Names of systems, see `geomap.soils.systems.SYSTEMS`.
    gradations
        Curves in long form (``sample_row``, ``size_mm``, ``passing_pct``) in place of the passing columns.
    organic_limit_pct
        Organic content above which the project calls a soil peat [%]; None: only the visual group does.
    with_reasons
        Add the columns ``_reason`` and ``_candidates`` of each system.

    Returns
    -------
    For each system its class and ``_basis``, ``_reason``, ``_candidates``, ``_near_limit``, with ``uscs_name`` and
    ``group_index``. Text columns are categorical.

    Raises
    ------
    UsageError
        There is no system of that name.

    Examples
    --------
    >>> samples = pd.DataFrame({"passing_4_75_mm_pct": [100.0], "passing_2_mm_pct": [97.0],
    ...     "passing_0_425_mm_pct": [80.0], "passing_0_075_mm_pct": [61.0], "liquid_limit_pct": [45.0],
    ...     "plastic_limit_pct": [25.0]})
    >>> classes = classify_samples(samples)
    >>> classes["uscs_name"].tolist(), classes["aashto_group"].tolist(), classes["group_index"].tolist()
    (['sandy lean clay'], ['A-7-6'], [10])
    """
    names = tuple(systems)
    if gradations is None:
        needs = {need for system in systems_named(names) for need in system.NEEDS}
        curves = table_from_wide(samples)
        records = properties.essentials(samples, curves, needs, organic_limit_pct=organic_limit_pct)
    else:
        row = samples.index.get_indexer(pd.Index(gradations["sample_row"]))
        points = gradation.curves_from_long(gradations, row, len(samples))
        records = properties.properties(samples, points, organic_limit_pct=organic_limit_pct)
    return classify(records, names, with_reasons=with_reasons)
