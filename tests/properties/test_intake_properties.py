"""Intake under random dirt: no row vanishes, and no value changes without a finding that names its cell."""

from __future__ import annotations

import dataclasses
import re

import numpy as np
import pandas as pd
from hypothesis import Phase, given, settings
from hypothesis import strategies as st

from geomap.intake import Intake, accept, place, screen
from geomap.tables import schema
from geomap.tables.raw import RawTable
from tests.unit.intake.written import clean

USUAL_DIRT = ["0", "-1", "-999", "NP", "", "<2", "500", "n/a"]  # half of the dirt
DIRT = [
    "", "0", "-1", "-999", "999", "n/a", "-", "NP", "n.p.", "<2", ">100", "≤5", "1,5", "1 200", "12 m", "#REF!", "abc",
    "3-Apr", "2026-04-03", "03/04/2026", "1E+05", "007", "BH-1", "bh-2", "BH1", "S1", "s1", "1e400", "-5", "38", "20",
    "500", "0.5", "2.5", "7", "50/75 mm", "Fill", "rock", "CH", "inf", "nan", "100", "12.5%", "  4 ",
]  # fmt: skip
COPIES = 5
GENERATE = (Phase.explicit, Phase.reuse, Phase.generate)  # a smaller seed is not a smaller case


def many() -> list[RawTable]:
    """Return the clean tables several times over, each time with borings of other names."""
    tables = []
    for table in clean():
        parts = []
        for copy in range(COPIES):
            cells = table.cells.copy()
            number = cells["boring"].str.removeprefix("BH-").astype(int) + 3 * copy
            parts.append(cells.assign(boring="BH-" + number.astype("string")))
        cells = pd.concat(parts)
        tables.append(dataclasses.replace(table, cells=cells.set_axis(range(2, 2 + len(cells)))))
    return tables


TEMPLATE = many()


def dirty_tables(seed: int, share: float) -> list[RawTable]:
    """Return the clean tables with a share of their cells overwritten and some rows given twice."""
    random = np.random.default_rng(seed)
    tables = []
    for table in TEMPLATE:
        texts = table.cells.to_numpy(dtype=object, na_value=None)
        usual = random.random(texts.shape) < 0.5
        dirt = np.where(usual, random.choice(USUAL_DIRT, texts.shape), random.choice(DIRT, texts.shape)).astype(object)
        dirt[dirt == ""] = None
        texts = np.where(random.random(texts.shape) < share, dirt, texts)
        texts = np.vstack([texts, texts[random.integers(0, len(texts), random.integers(0, 4))]])
        cells = pd.DataFrame(texts, columns=table.cells.columns, index=range(2, 2 + len(texts)), dtype="string")
        tables.append(dataclasses.replace(table, cells=cells, original=cells.copy()))
    return tables


def rows_named(finding: pd.Series) -> set[int]:
    """Return the rows that a finding is about, those gathered in its text included."""
    gathered = re.search(r"\(in \d+ rows: ([\d, -]+)\)$", str(finding["found"]))
    if not gathered:
        return set() if pd.isna(finding["row_number"]) else {int(finding["row_number"])}
    spans = [[int(n) for n in span.split("-")] for span in gathered.group(1).split(", ")]
    return {row for span in spans for row in range(span[0], span[-1] + 1)}


def cells_named(findings: pd.DataFrame) -> set[tuple[str, int, str]]:
    """Return file, row and heading of every cell that some finding names."""
    return {
        (finding["file"], row, heading)
        for _, finding in findings.iterrows()
        for row in rows_named(finding)
        for heading in str(finding["heading"]).split(", ")
    }


def same(raw: object, value: object, column: schema.Column, bound: object) -> bool:
    """Return whether the value used says what the cell says."""
    if pd.isna(raw) or not str(raw).strip():
        return bool(pd.isna(value))
    text = str(raw).strip()
    if column.nonplastic and re.sub("[^a-z]", "", text.lower()) == "np":
        return bool(pd.isna(value))
    if column.type == "number":
        number = text.lstrip("<>").rstrip("%")
        sign = text[0] if text[0] in "<>" else ""
        try:
            return float(number) == value and sign == ("" if pd.isna(bound) else bound)
        except ValueError:
            return False
    if pd.isna(value):
        return False
    said, written = (" ".join(str(words).split()) for words in (value, text))
    return said.lower() == written.lower() if column.choices else said == written


def values_used(taken: Intake, layout: str) -> dict[tuple[int, str], object]:
    """Return the value that intake uses for each cell of a table; a passing column is found among the points."""
    rows = taken.rows(layout)
    used = {(position, str(name)): value for name in rows for position, value in enumerate(rows[name].tolist())}
    points = taken.rows("gradations")
    points = points.loc[~points["in_layout"]]
    if layout == "samples":
        place = zip(points["sample_row"].astype(int), points["heading"], points["passing_pct"], strict=True)
        used |= {(row, heading): value for row, heading, value in place}
    return used


@given(st.integers(0, 2**32), st.sampled_from([0.03, 0.12]))
@settings(max_examples=12, deadline=None, phases=GENERATE)
def test_whatever_the_dirt_no_row_vanishes_and_no_value_changes_unsaid(seed: int, share: float) -> None:
    tables = dirty_tables(seed, share)
    taken = screen(accept(tables))
    values_change_only_where_said(taken, tables)
    rows_are_used_or_left_out_with_a_reason(taken, tables)
    later_stages_get_what_they_rely_on(taken)


def values_change_only_where_said(taken: Intake, tables: list[RawTable]) -> None:
    named = cells_named(taken.findings)
    for table in tables:
        used = values_used(taken, table.layout)
        for name in table.cells:
            column, heading = schema.column(name), table.headings[name].found
            for position, (row, raw) in enumerate(table.cells[name].items()):
                value, bound = used.get((position, name), np.nan), used.get((position, f"{name}_bound"), pd.NA)
                if not same(raw, value, column, bound):
                    words = f"{table.file} row {row} {heading}: {raw!r} -> {value!r}"
                    assert (table.file, row, heading) in named, words


def rows_are_used_or_left_out_with_a_reason(taken: Intake, tables: list[RawTable]) -> None:
    counts = taken.counts().set_index("table")
    for table in tables:
        rows = taken.rows(table.layout)
        rows = rows.loc[rows["in_layout"]] if "in_layout" in rows else rows
        assert rows["row_number"].tolist() == table.cells.index.tolist()
        assert set(rows["status"]) <= {"used", "left out"}
        assert counts.loc[table.layout, "read"] == len(table.cells)
        assert counts.loc[table.layout, "used"] + counts.loc[table.layout, "left_out"] == len(table.cells)
        out = rows.loc[rows["status"] == "left out"]
        assert (out["reason"].fillna("") != "").all()
        assert rows.loc[rows["status"] == "used", "reason"].isna().all()
        found = taken.findings.loc[taken.findings["file"] == table.file]
        said = {row for _, finding in found.iterrows() for row in rows_named(finding)}
        for row in out["row_number"]:
            assert row in said, f"{table.file} row {row} is left out and nobody says so"


def later_stages_get_what_they_rely_on(taken: Intake) -> None:
    borings, samples, strata, points = (taken.used(n) for n in ("borings", "samples", "strata", "gradations"))
    assert borings[["boring", "x", "y", "depth_m"]].notna().all(axis=None)
    assert borings["boring"].is_unique
    for table in (samples, strata):
        assert set(table["boring"]) <= set(borings["boring"])
        assert table["top_depth_m"].notna().all()
        assert not (table["base_depth_m"] < table["top_depth_m"] - 0.011).any()
    assert set(points["sample_row"]) <= set(samples.index)
    assert points[["size_mm", "passing_pct"]].notna().all(axis=None)
    assert not points.duplicated(["sample_row", "size_mm"]).any()
    falling = points.sort_values(["sample_row", "size_mm"]).groupby("sample_row")["passing_pct"].diff()
    assert not (falling < -1.0).any()
    limits = samples[["liquid_limit_pct", "plastic_limit_pct"]]
    assert not (limits <= 0).any(axis=None)
    plastic = ~samples["is_nonplastic"].fillna(False).astype(bool)
    assert not (limits["liquid_limit_pct"] < limits["plastic_limit_pct"] - 1)[plastic].any()


@given(st.integers(0, 2**32))
@settings(max_examples=4, deadline=None, phases=GENERATE)
def test_counts_add_up_after_the_intake_of_places(seed: int) -> None:
    taken = screen(accept(dirty_tables(seed, 0.02)))
    index = taken.used("borings").index
    offsets = np.random.default_rng(seed).normal(0, 75, len(index))
    placed = pd.DataFrame({"distance_m": 100.0, "offset_m": offsets}, index=index)
    taken = place(taken, placed.assign(ambiguous=False, past_end=False), half_width_m=75)
    counts = taken.counts()
    assert (counts["read"] == counts["used"] + counts["left_out"]).all()
    kept = set(taken.used("borings")["boring"])
    assert all(set(taken.used(name)["boring"]) <= kept for name in ("samples", "strata"))
    assert set(taken.used("gradations")["sample_row"]) <= set(taken.used("samples").index)


def test_many_clean_tables_give_no_findings() -> None:
    assert screen(accept(TEMPLATE)).findings.empty
