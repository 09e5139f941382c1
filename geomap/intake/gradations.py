"""Intake of gradations: points from columns of the samples table and rows of the gradations table, as one long table.

Each point knows its sample (``sample_row``), and the file, sheet, row and heading it was read from.
"""

from __future__ import annotations

import dataclasses

import pandas as pd

from geomap.intake.entries import USED, Entries, Flags, Intake
from geomap.intake.gathering import EVERY_SEVERITY, gathered
from geomap.intake.rows import loose_key, name_key
from geomap.tables import schema
from geomap.tables.findings import Check

SAME_DEPTH_M = 0.01  # depths are written to the centimeter
PASSING = "passing_pct"

NO_SAMPLE = Check(
    "gradation of an unknown sample",
    "reject",
    "a boring and sample of the samples table",
    "the gradation is left out; correct the names, or add the sample to the samples table",
)
WHICH_SAMPLE = Check(
    "gradation of a sample name used twice",
    "reject",
    "a sample name that stands at one depth",
    "the gradation is left out; give the two samples different names in both tables",
)
SAME_POINT = Check(
    "sieve given twice",
    "convert",
    "each size once in a sample",
    "the same value stands in another row and is used once",
)
OTHER_POINT = Check(
    "sieve given twice with two values",
    "query",
    "each size once in a sample",
    "the first value is used and this one left out; check which is right",
)
WIDE_AND_LONG = Check(
    "sieve in two tables with two values",
    "query",
    "one value for each size of a sample",
    "the gradations table is used and this value left out; check which is right",
)


def as_points(intake: Intake) -> Intake:
    """Join passing columns of the samples table and rows of the gradations table into one long table."""
    if "samples" not in intake:
        return intake
    long, parts = _linked(intake)
    samples = intake["samples"]
    wide = _melted(samples)
    names = schema.passing_columns(samples.rows.columns)
    points = _joined(dataclasses.replace(long, headings={**samples.headings, **long.headings}), wide)
    samples = dataclasses.replace(samples, rows=samples.rows.drop(columns=names))
    return _each_size_once(intake.having(samples).having(points, *parts))


def _linked(intake: Intake) -> tuple[Entries, list[pd.DataFrame]]:
    """Return the gradations table with the sample of each row, and findings where there is none."""
    if "gradations" not in intake:
        return _empty(), []
    curves, samples = intake["gradations"], intake["samples"]
    rows = samples.rows.loc[~samples.missing("boring") & ~samples.missing("sample")]
    known = pd.DataFrame(
        {"key": _sample_key(rows), "row": rows.index, "depth": rows["top_depth_m"], "status": rows["status"]}
    )
    known = known.sort_values("status", key=lambda s: s != USED, kind="stable")  # a row in use before one left out
    depth = known.loc[known["status"] == USED].groupby("key")["depth"]
    twice = set((depth.max() - depth.min())[lambda spread: spread > SAME_DEPTH_M].index)
    row = known.drop_duplicates("key").set_index("key")["row"]
    key = _sample_key(curves.rows)
    sample_row = key.map(row).astype("Int64")
    orphan = curves.used & sample_row.isna().to_numpy(dtype=bool)
    unclear = curves.used & key.isin(twice).to_numpy(dtype=bool)
    place = ("boring", "sample")
    parts = [
        gathered(_orphans(curves, orphan, intake["samples"]), limit=1, severities=EVERY_SEVERITY),
        gathered([curves.findings_of(WHICH_SAMPLE, unclear, *place)], limit=1, severities=EVERY_SEVERITY),
    ]
    curves = curves.leave_out(orphan, "its sample is not in the samples table")
    curves = curves.leave_out(unclear, "its sample name stands at two depths")
    heading = pd.array(curves.heading(PASSING), dtype="string")
    return dataclasses.replace(
        curves, rows=curves.rows.assign(sample_row=sample_row, heading=heading, in_layout=True)
    ), parts


def _orphans(curves: Entries, orphan: Flags, samples: Entries) -> list[pd.DataFrame]:
    """Return findings on rows without a sample, with the sample that may be meant."""
    rows = samples.rows
    alike = pd.Series(rows["sample"].to_numpy(object), loose_key(rows["boring"]) + "\n" + loose_key(rows["sample"]))
    alike = alike[alike.index.notna()].groupby(level=0).first()
    meant = (loose_key(curves.rows["boring"]) + "\n" + loose_key(curves.rows["sample"])).map(alike)
    near = meant.astype(object).where(meant.notna(), "").to_numpy(object)
    parts = []
    for name in pd.unique(near[orphan]):
        check = (
            NO_SAMPLE if not name else dataclasses.replace(NO_SAMPLE, advice=f"did you mean {name}? {NO_SAMPLE.advice}")
        )
        parts.append(curves.findings_of(check, orphan & (near == name), "boring", "sample"))
    return parts


def _sample_key(rows: pd.DataFrame) -> pd.Series:
    return name_key(rows["boring"]) + "\n" + name_key(rows["sample"])


def _empty() -> Entries:
    rows = schema.conform(
        pd.DataFrame(), schema.inputs()["gradations"], extra=(*schema.SOURCE_COLUMNS, "status", "reason")
    )
    rows = rows.assign(sample_row=pd.array([], dtype="Int64"), heading=pd.array([], dtype="string"), in_layout=True)
    return Entries(
        "gradations", rows, pd.DataFrame({c: pd.array([], dtype="string") for c in ("size_mm", PASSING)}), {}
    )


def _melted(samples: Entries) -> pd.DataFrame:
    """Return the passing columns of the samples table as points, with the text of each cell in ``text``."""
    parts = []
    for name in schema.passing_columns(samples.rows.columns):
        part = samples.rows[["boring", "sample", *schema.SOURCE_COLUMNS, "status", "reason"]].assign(
            sample_row=samples.rows.index.to_series().astype("Int64"),
            size_mm=schema.size_from_passing_column(name),
            passing_pct=samples.rows[name],
            heading=pd.array(samples.heading(name), dtype="string"),
            text=pd.array(samples.texts(name), dtype="string"),
            in_layout=False,
        )
        parts.append(part.loc[part[PASSING].notna()])
    return pd.concat(parts, ignore_index=True) if parts else pd.DataFrame()


def _joined(long: Entries, wide: pd.DataFrame) -> Entries:
    if not len(wide):
        return long
    size = wide["size_mm"].map("{:g}".format)
    cells = pd.DataFrame({"size_mm": size, PASSING: wide["text"], "boring": wide["boring"], "sample": wide["sample"]})
    rows = wide[[c for c in long.rows.columns if c in wide.columns]]
    if len(long.rows):
        rows = pd.concat([long.rows, rows], ignore_index=True)
        cells = pd.concat([long.cells, cells], ignore_index=True)
    types = {"sample_row": "Int64", "in_layout": "bool", "heading": "string", **_types()}
    rows = rows.astype({name: kind for name, kind in types.items() if name in rows})
    return Entries(
        "gradations", rows.reset_index(drop=True), cells.astype("string").reset_index(drop=True), long.headings
    )


def _types() -> dict[str, str]:
    names = (*schema.inputs()["gradations"].columns, *schema.SOURCE_COLUMNS, "status", "reason")
    return {name: schema.column(name).dtype for name in names}


def _each_size_once(intake: Intake) -> Intake:
    """Keep one value for each size of a sample; the gradations table stands before columns of the samples table."""
    points = intake["gradations"]
    rows = points.rows.loc[points.used]
    if not len(rows):
        return intake
    key = [rows["sample_row"], rows["size_mm"].round(6)]
    first = rows[PASSING].groupby(key).transform("first")
    first_long = rows["in_layout"].groupby(key).transform("first")
    again = pd.DataFrame({"row": key[0], "size": key[1]}).duplicated()
    equal = rows[PASSING] == first
    wide = first_long & ~rows["in_layout"]
    every = points.rows.index
    same, two, other = (
        mask.reindex(every, fill_value=False).to_numpy(dtype=bool)
        for mask in (again & equal, again & ~equal & wide, again & ~equal & ~wide)
    )
    found = points.found("size_mm") + " mm: " + points.found(PASSING)
    parts = [
        gathered([points.findings_of(SAME_POINT, same, PASSING, found=found)]),
        points.findings_of(WIDE_AND_LONG, two, PASSING, found=found),
        points.findings_of(OTHER_POINT, other, PASSING, found=found),
    ]
    points = points.leave_out(same, "the same value is given above")
    return intake.having(points.leave_out(two | other, "another value for this size is used"), *parts)


CHECKS = (as_points,)
