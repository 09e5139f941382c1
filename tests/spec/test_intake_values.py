"""What geomap makes of one cell: the text in the file, the value used, and what it asks.

Constructed from the rules of intake; none of these is a published value. "-" in the last column: nothing is asked.
"""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.intake import accept
from tests.unit.intake.written import raw

ABSENT = None
# column, text in the file, value used (as text), what is asked
NUMBERS = [
    ("moisture_pct", "21.5", "21.5", "-"),
    ("moisture_pct", "  21.5 ", "21.5", "-"),
    ("moisture_pct", "21.5%", "21.5", "-"),
    ("moisture_pct", "'21.5", "21.5", "-"),
    ("moisture_pct", ".5", "0.5", "-"),
    ("moisture_pct", "1e2", "100", "-"),
    ("redox_mv", "\u2212120", "-120", "-"),
    ("moisture_pct", "1 234", ABSENT, "unclear separator"),
    ("max_dry_density_kg_m3", "1,834", ABSENT, "unclear separator"),
    ("moisture_pct", "21,5", ABSENT, "unclear separator"),
    ("moisture_pct", "about 20", ABSENT, "not a number"),
    ("moisture_pct", "20-25", ABSENT, "not a number"),
    ("moisture_pct", "n/a", ABSENT, "no result in words"),
    ("moisture_pct", "-", ABSENT, "no result in words"),
    ("moisture_pct", "nil", ABSENT, "no result in words"),
    ("moisture_pct", "Not tested", ABSENT, "no result in words"),
    ("moisture_pct", "-999", ABSENT, "code for no result"),
    ("ground_level_m", "-9999.0", ABSENT, "code for no result"),
    ("moisture_pct", "999", "999", "possible code for no result"),
    ("moisture_pct", "#DIV/0!", ABSENT, "failed formula"),
    ("moisture_pct", "2001", ABSENT, "out of range"),
    ("moisture_pct", "-3", ABSENT, "out of range"),
    ("ph", "14.2", ABSENT, "out of range"),
    ("top_depth_m", "-1.5", ABSENT, "negative depth"),
    ("top_depth_m", "1.5 m", "1.5", "unit in the cell"),
    ("top_depth_m", "5 ft", ABSENT, "other unit in the cell"),
    ("moisture_pct", "3-Apr", ABSENT, "date in place of a number"),
    ("passing_0_075_mm_pct", "2026-04-03", ABSENT, "date in place of a number"),
    ("passing_0_075_mm_pct", "2026-04-03 00:00:00", ABSENT, "date in place of a number"),
    ("passing_0_075_mm_pct", "100.5", ABSENT, "out of range"),
    ("cbr_soaked_pct", "<2", "2 <", "-"),
    ("cbr_soaked_pct", "> 100", "100 >", "-"),
    ("cbr_soaked_pct", "≤2", "2 <", "or equal"),
    ("cbr_soaked_pct", ">=100", "100 >", "or equal"),
    ("cbr_soaked_pct", ">500", ABSENT, "out of range"),
    ("moisture_pct", "<2", ABSENT, "less than or more than"),
    ("spt_n", "50/75 mm", "50 >", "driving refusal"),
    ("spt_n", '50/3"', "50 >", "driving refusal"),
    ("spt_n", "50/300", ABSENT, "not a number"),
    ("spt_n", "3/4/5", ABSENT, "not a number"),
]
NONPLASTIC = ["NP", "np", "N.P.", "N/P", "non-plastic", "Non Plastic", "nonplastic", "NON_PLASTIC"]
TEXTS = [
    ("boring", " BH  3 ", "BH 3", "-"),
    ("boring", "MAR-10", "MAR-10", "-"),
    ("boring", "1E05", "1E05", "-"),
    ("boring", "3-Apr", ABSENT, "name changed by a spreadsheet"),
    ("sample", "Mar-10", ABSENT, "name changed by a spreadsheet"),
    ("sample", "2026-04-03", ABSENT, "name changed by a spreadsheet"),
    ("boring", "1E+05", ABSENT, "name changed by a spreadsheet"),
    ("boring", "-", ABSENT, "no entry in words"),
    ("visual_group", "#REF!", ABSENT, "failed formula"),
    ("description", "-", "-", "-"),
    ("origin", "Made Ground", "made ground", "-"),
    ("origin", "made_ground", "made ground", "-"),
    ("origin", "Fill", "made ground", "other word for a choice"),
    ("origin", "loess", ABSENT, "not one of the choices"),
    ("sulfide", "TRACE", "trace", "-"),
    ("is_nonplastic", "yes", "True", "-"),
    ("is_nonplastic", "0", "False", "-"),
    ("is_nonplastic", "perhaps", ABSENT, "not yes or no"),
]
DATES = [
    ("2026-04-03", "2026-04-03", "-"),
    ("2026-04-03 00:00:00", "2026-04-03", "-"),
    ("2026/04/03", "2026-04-03", "date in another order"),
    ("3 Apr 2026", "2026-04-03", "date in another order"),
    ("23/04/2026", "2026-04-23", "date in another order"),
    ("04/23/2026", "2026-04-23", "date in another order"),
    ("04/04/2026", "2026-04-04", "date in another order"),
    ("03/04/2026", ABSENT, "unclear date"),
    ("2026-13-40", ABSENT, "not a date"),
    ("46115", ABSENT, "not a date"),
    ("soon", ABSENT, "not a date"),
]


def made_of(column: str, text: str, layout: str = "samples") -> tuple[str | None, str]:
    """Return the value used and the check that asks, for one cell under one heading."""
    taken = accept([raw(layout, f"{column}\n{text}")])
    row = taken.rows(layout).iloc[0]
    bound = row.get(f"{column}_bound", pd.NA)
    value = (
        None if pd.isna(row[column]) else (f"{row[column]:g}" if isinstance(row[column], float) else str(row[column]))
    )
    asked = taken.findings["topic"].tolist() or ["-"]
    assert len(asked) == 1
    if asked != ["-"]:
        assert taken.findings.loc[0, "found"].startswith(text.strip())
        assert taken.findings.loc[0, "row_number"] == 2
    return value if pd.isna(bound) else f"{value} {bound}", asked[0]


@pytest.mark.parametrize(("column", "text", "value", "asked"), NUMBERS)
def test_a_number_column_makes_of(column: str, text: str, value: str | None, asked: str) -> None:
    layout = "borings" if column == "ground_level_m" else "samples"
    assert made_of(column, text, layout) == (value, asked)


@pytest.mark.parametrize("text", NONPLASTIC)
def test_np_in_any_spelling_is_non_plastic(text: str) -> None:
    row = accept([raw("samples", f"PI:plasticity_index_pct\n{text}")]).rows("samples").iloc[0]
    assert row["is_nonplastic"]
    assert pd.isna(row["plasticity_index_pct"])


@pytest.mark.parametrize(("column", "text", "value", "asked"), TEXTS)
def test_a_text_column_makes_of(column: str, text: str, value: str | None, asked: str) -> None:
    assert made_of(column, text) == (value, asked)


@pytest.mark.parametrize(("text", "value", "asked"), DATES)
def test_a_date_column_makes_of(text: str, value: str | None, asked: str) -> None:
    assert made_of("date", text, "borings") == (value, asked)
