"""Intake of strata against samples: origin and unit of a sample, and of the layer that holds it."""

from __future__ import annotations

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.intake.entries import Entries, Flags, Intake, Texts
from geomap.intake.gathering import EVERY_SEVERITY, gathered
from geomap.intake.rows import name_key
from geomap.tables.findings import Check

ORIGIN = Check(
    "origin against the layer",
    "query",
    "the origin of the layer that holds the middle of the sample, or blank",
    "the sample keeps its own; check its depths, and which of the two is right",
)
UNIT = Check(
    "unit against the layer",
    "query",
    "the unit of the layer that holds the middle of the sample, or blank",
    "the sample keeps its own; check its depths, and which of the two is right",
)
UNIT_SPELLING = Check(
    "unit spelled otherwise",
    "convert",
    "one spelling of each unit",
    "units that differ only in capitals or blanks are taken as one, in the spelling that stands first",
)


def holding(intake: Intake) -> NDArray[np.int64]:
    """Return, for each row of samples, the index of the used stratum that holds its middle depth, or -1.

    A sample without a base is a point at its top. Where strata overlap or meet, the one that begins deeper holds it.
    """
    samples = intake["samples"]
    found = np.full(len(samples.rows), -1, dtype=np.int64)
    if "strata" not in intake:
        return found
    strata = intake["strata"]
    top, base = samples.numbers("top_depth_m"), samples.numbers("base_depth_m")
    middle = (top + np.where(np.isnan(base), top, base)) / 2
    boring = pd.factorize(pd.concat([samples.rows["boring"], strata.rows["boring"]]))[0]
    points = pd.DataFrame({"boring": boring[: len(found)], "depth": middle, "row": np.arange(len(found))})
    layers = pd.DataFrame(
        {
            "boring": boring[len(found) :],
            "top": strata.numbers("top_depth_m"),
            "base": strata.numbers("base_depth_m"),
            "stratum": np.arange(len(strata.rows)),
        }
    )
    named = points["boring"] >= 0  # a row without a boring lies in no layer
    pairs = points.loc[samples.used & named].merge(layers.loc[strata.used], on="boring")
    pairs = pairs.loc[(pairs["depth"] >= pairs["top"]) & (pairs["depth"] <= pairs["base"])]
    last = pairs.sort_values(["row", "top", "stratum"]).drop_duplicates("row", keep="last")
    found[last["row"].to_numpy(int)] = last["stratum"].to_numpy(int)
    return found


def of_layer(strata: Entries, layer: NDArray[np.int64], column: str) -> pd.Series:
    """Return the text under `column` of each of `layer`; missing where there is no layer (-1)."""
    return strata.rows[column].reindex(layer).reset_index(drop=True)


def beside(samples: Entries, strata: Entries, layer: NDArray[np.int64], differs: Flags, column: str) -> Texts:
    """Return, where `differs` is true, what the layer says under `column`, its depths, and where it was read."""
    words = np.full(len(samples.rows), "", dtype=object)
    names = [column, "top_depth_m", "base_depth_m", "file", "sheet", "row_number"]
    read = strata.rows[names].reindex(layer[differs])
    read["sheet"] = (", sheet " + read["sheet"].mask(read["sheet"] == "")).fillna("")
    words[differs] = [
        f"{said} in the layer from {top:g} to {base:g} m ({file}{sheet}, row {row})"
        for said, top, base, file, sheet, row in read.itertuples(index=False, name=None)
    ]
    return words


def unit_spelling(intake: Intake) -> Intake:
    """Give units that differ only in capitals or blanks one spelling: the first in the strata, then the samples."""
    tables = [intake[name] for name in ("strata", "samples") if name in intake]
    if not tables:
        return intake
    units = pd.concat([entries.rows.loc[entries.used, "unit"] for entries in tables]).dropna()
    spelling = pd.Series(units.to_numpy(object), name_key(units)).groupby(level=0).first()
    for entries in tables:
        written = entries.rows["unit"]
        proper = name_key(written).map(spelling)
        other = (proper.notna() & (proper != written).fillna(False)).to_numpy(dtype=bool)
        taken_as = (" (taken as " + proper.astype("string").fillna("") + ")").to_numpy(object)
        said = entries.findings_of(UNIT_SPELLING, other & entries.used, "unit", found=entries.found("unit") + taken_as)
        part = gathered([said], limit=1, severities=EVERY_SEVERITY)
        intake = intake.having(entries.with_values(other & entries.used, "unit", proper.to_numpy(object)), part)
    return intake


def same_layer(intake: Intake) -> Intake:
    """Ask where a sample and the layer that holds it state different origins or units."""
    if "samples" not in intake or "strata" not in intake:
        return intake
    samples, strata = intake["samples"], intake["strata"]
    layer = holding(intake)
    parts = []
    for column, check in (("origin", ORIGIN), ("unit", UNIT)):
        ours, theirs = name_key(samples.rows[column]), name_key(of_layer(strata, layer, column))
        differs = (ours.reset_index(drop=True) != theirs).fillna(False).to_numpy(dtype=bool)
        differs &= ours.notna().to_numpy(dtype=bool) & theirs.notna().to_numpy(dtype=bool)
        found = samples.found(column) + np.where(differs, "; ", "") + beside(samples, strata, layer, differs, column)
        said = [samples.findings_of(check, differs, column, found=found)]
        parts.append(gathered(said, severities=EVERY_SEVERITY))
    return intake.having(samples, *parts)


CHECKS = (unit_spelling, same_layer)
