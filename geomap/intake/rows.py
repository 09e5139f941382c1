"""Intake of rows: what a row must have, rows given twice, and names that must agree between tables.

A row that cannot be used is left out: it keeps its place in the table, with the reason beside it.
"""

from __future__ import annotations

import dataclasses

import numpy as np
import pandas as pd

from geomap.intake.entries import Entries, Flags, Intake, Texts
from geomap.intake.gathering import EVERY_SEVERITY, gathered
from geomap.tables import schema
from geomap.tables.findings import Check

INCOMPLETE = Check(
    "row without what it needs", "reject", "", "the row is left out; fill in what is blank or was rejected"
)
BROKEN_LINE = Check(
    "vertex without coordinates",
    "block",
    "x and y in each row",
    "a line cannot leave out a vertex; give its coordinates",
)
REPEATED_ROW = Check("row given twice", "convert", "each row once", "the row is left out; the same row stands above it")
MOVED_BORING = Check(
    "boring given twice, in two places",
    "query",
    "each boring once",
    "the first is used and this one left out; its samples cannot be told apart: give one of the two another name",
)
REPEATED_BORING = Check(
    "boring given twice",
    "query",
    "each boring once",
    "the first is used and this one left out; remove the row that is superseded",
)
SIMILAR_NAMES = Check(
    "names of borings alike",
    "query",
    "names that differ in more than blanks, marks and zeros",
    "both are used; if they are one boring, give it one name in all tables",
)
OTHER_SPELLING = Check("boring spelled otherwise", "convert", "", "the spelling of the borings table is used")
ORPHAN = Check("boring not in the borings table", "reject", "a boring of the borings table", "")
REPEATED_SAMPLE = Check(
    "sample name used at two depths",
    "query",
    "each sample name once in a boring",
    "both rows are used; give one of them another name, so that lab sheets can be told apart",
)
WITH_BORING = Check(
    "left out with its boring",
    "reject",
    "a boring that is used",
    "left out as its boring is; settle the findings about the boring",
    "note",
)
WITH_SAMPLE = Check(
    "left out with its sample",
    "reject",
    "a sample that is used",
    "left out as its sample is; settle the findings about the sample",
    "note",
)


def name_key(names: pd.Series) -> pd.Series:
    """Return names as they are compared: blanks and upper or lower case make no difference.

    Examples
    --------
    >>> name_key(pd.Series([" BH  01", "bh 01"], dtype="string")).tolist()
    ['bh 01', 'bh 01']
    """
    return names.str.strip().str.replace(r"\s+", " ", regex=True).str.casefold()


def loose_key(names: pd.Series) -> pd.Series:
    """Return names without marks and leading zeros, to find the ones that may mean the same.

    Examples
    --------
    >>> loose_key(pd.Series(["BH-01", "BH1", "bh 01", "BH-1-1", "BH-11"], dtype="string")).tolist()
    ['bh 1', 'bh 1', 'bh 1', 'bh 1 1', 'bh 11']
    """
    spaced = names.str.casefold().str.replace(r"(\d+)", r" \1 ", regex=True)
    words = spaced.str.replace(r"[\W_]+", " ", regex=True).str.strip()
    return words.str.replace(r"\b0+(\d)", r"\1", regex=True)


def complete(intake: Intake) -> Intake:
    """Leave out rows that lack what their layout requires; a line that lacks a vertex blocks."""
    for name, entries in intake.entries.items():
        needed = [c for c in schema.inputs()[name].required if c in entries.rows.columns]
        lacking = np.column_stack([entries.missing(c) for c in needed])
        incomplete = lacking.any(axis=1) & entries.used
        if not incomplete.any():
            continue
        reason = _lacking(lacking, needed)
        check = BROKEN_LINE if name == "vertices" else INCOMPLETE
        check = dataclasses.replace(check, allowed=check.allowed or f"{', '.join(needed)} in each row")
        found = entries.findings_of(check, incomplete, *needed)
        intake = intake.having(entries.leave_out(incomplete, reason), found)
    return intake


def _lacking(lacking: Flags, columns: list[str]) -> Texts:
    """Return for each row which columns it lacks, in words."""
    words = np.full(len(lacking), "", dtype=object)
    for i, column in enumerate(columns):
        joiner = np.where((words != "") & lacking[:, i], " and ", "")
        words = words + joiner + np.where(lacking[:, i], column, "")
    return np.where(words == "", "", words + " missing or rejected")


def repeated(intake: Intake) -> Intake:
    """Leave out rows of keyed tables whose every cell repeats an earlier row."""
    for name, entries in intake.entries.items():
        if not schema.inputs()[name].key or not len(entries.rows):
            continue
        cells = entries.cells.fillna("")
        again = (cells.duplicated() & entries.used).to_numpy(dtype=bool)
        found = entries.findings_of(REPEATED_ROW, again, *schema.inputs()[name].key)
        intake = intake.having(entries.leave_out(again, "the same row is given above"), found)
    return intake


def borings_once(intake: Intake) -> Intake:
    """Keep the first of several borings of one name, and ask about names that look like one."""
    if "borings" not in intake:
        return intake
    borings = intake["borings"]
    rows = borings.rows.loc[borings.used]
    keys = name_key(rows["boring"])
    again = keys.duplicated()
    first = rows.loc[~again].set_index(keys[~again])
    elsewhere = pd.Series(False, rows.index)
    for axis in ("x", "y"):
        elsewhere |= rows[axis].to_numpy() != first[axis].reindex(keys).to_numpy()
    moved = _mask(borings, again & elsewhere)
    same = _mask(borings, again & ~elsewhere)
    columns = [c for c in ("boring", "x", "y") if c in borings.cells.columns]
    parts = [
        borings.findings_of(MOVED_BORING, moved, *columns),
        borings.findings_of(REPEATED_BORING, same, *columns),
    ]
    borings = borings.leave_out(moved | same, "a boring of this name is given above")
    parts.append(_similar_names(borings))
    return intake.having(borings, *parts)


def _similar_names(borings: Entries) -> pd.DataFrame:
    names = borings.rows.loc[borings.used, "boring"]
    keys = loose_key(names)
    alike = keys.duplicated()
    other = keys.map(names.groupby(keys).first())
    found = names.astype(object) + " and " + other.astype(object)
    return borings.findings_of(
        SIMILAR_NAMES, _mask(borings, alike), "boring", found=found.reindex(borings.rows.index).to_numpy(object)
    )


def borings_known(intake: Intake) -> Intake:
    """Give samples, strata and gradations the spelling of the borings table; leave out what names no boring."""
    if "borings" not in intake:
        return intake
    borings = intake["borings"].rows
    names = borings["boring"].dropna()
    spelling = pd.Series(names.to_numpy(object), name_key(names)).groupby(level=0).first()
    alike = pd.Series(names.to_numpy(object), loose_key(names)).groupby(level=0).first()
    for table in ("samples", "strata", "gradations"):
        if table in intake and len(intake[table].rows):
            intake = _known(intake, intake[table], spelling, alike)
    return intake


def _known(intake: Intake, entries: Entries, spelling: pd.Series, alike: pd.Series) -> Intake:
    written = entries.rows["boring"]
    proper = name_key(written).map(spelling)
    respelled = (proper.notna() & (proper != written).fillna(False)).to_numpy(dtype=bool)
    orphan = (written.notna() & proper.isna()).to_numpy(dtype=bool) & entries.used
    near = loose_key(written).map(alike)
    near_name = near.astype(object).where(near.notna(), "").to_numpy(object)
    parts = []
    for name in pd.unique(near_name[orphan]):
        advice = f"did you mean {name}? " if name else ""
        check = dataclasses.replace(
            ORPHAN, advice=f"{advice}the row is left out; correct the name, or add the boring to the borings table"
        )
        parts.append(entries.findings_of(check, orphan & (near_name == name), "boring"))
    parts = [gathered(parts, limit=1, severities=EVERY_SEVERITY)]
    spelled = dataclasses.replace(OTHER_SPELLING, allowed="the spelling of the borings table")
    parts.append(gathered([entries.findings_of(spelled, respelled, "boring")]))
    entries = entries.with_values(respelled, "boring", proper.to_numpy(object))
    return intake.having(entries.leave_out(orphan, "its boring is not in the borings table"), *parts)


def samples_once(intake: Intake) -> Intake:
    """Ask about a sample name that stands at two depths of one boring."""
    if "samples" not in intake:
        return intake
    samples = intake["samples"]
    rows = samples.rows.loc[samples.used & ~samples.missing("sample")]
    keys = [name_key(rows["boring"]), name_key(rows["sample"])]
    first = rows["top_depth_m"].groupby(keys).transform("first")
    moved = _mask(samples, (rows["top_depth_m"] - first).abs() > 0.01)
    columns = [c for c in ("boring", "sample", "top_depth_m") if c in samples.cells.columns]
    return intake.having(samples, samples.findings_of(REPEATED_SAMPLE, moved, *columns))


def left_out_together(intake: Intake) -> Intake:
    """Leave out samples and strata of borings that are left out, and gradations of such samples."""
    if "borings" in intake:
        borings = intake["borings"]
        kept = set(borings.rows.loc[borings.used, "boring"].dropna())
        for table in ("samples", "strata", "gradations"):
            if table in intake:
                lost = ~intake[table].rows["boring"].isin(kept).to_numpy(dtype=bool)
                intake = _follow(intake, table, lost, WITH_BORING, "its boring is left out")
    if "samples" in intake and "gradations" in intake and "sample_row" in intake["gradations"].rows:
        row = intake["gradations"].rows["sample_row"].fillna(-1).to_numpy(dtype=int)
        kept_row = np.append(intake["samples"].used, True)  # row -1, no sample, is judged where it was linked
        intake = _follow(intake, "gradations", ~kept_row[row], WITH_SAMPLE, "its sample is left out")
    return intake


def _follow(intake: Intake, table: str, lost: Flags, check: Check, reason: str) -> Intake:
    """Leave out rows because of another table; one note for each boring or sample."""
    entries = intake[table]
    fresh = lost & entries.used
    if not fresh.any():
        return intake
    # Points from a column of the samples table follow their row and are not said again.
    said = fresh & entries.rows.get("in_layout", pd.Series(True, entries.rows.index)).to_numpy(dtype=bool)
    notes = gathered([entries.findings_of(check, said, "boring")], limit=1, severities=EVERY_SEVERITY)
    return intake.having(entries.leave_out(fresh, reason), notes)


def _mask(entries: Entries, picked: pd.Series) -> Flags:
    """Return a flag for each row of a table from flags on part of its index."""
    return picked.reindex(entries.rows.index, fill_value=False).fillna(False).to_numpy(dtype=bool)


CHECKS = (complete, repeated, borings_once, borings_known, samples_once)
