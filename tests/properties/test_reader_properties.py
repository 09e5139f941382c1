"""A canonical table written in any spelling reads back as the same cells."""

from __future__ import annotations

import contextlib
import csv
import tempfile
from pathlib import Path

import hypothesis.strategies as st
from hypothesis import HealthCheck, given, settings

from geomap.errors import GeomapError
from geomap.readers import borings
from geomap.readers.headings import spellings
from geomap.readers.options import TableOptions
from geomap.readers.sieves import sieve_sizes, size_from_heading
from geomap.registry import for_file
from geomap.tables import schema
from geomap.tables.raw import RawTable
from geomap.tables.schema import passing_column

SAMPLES = schema.inputs()["samples"]
TEXT_COLUMNS = [name for name in SAMPLES.columns if schema.column(name).type == "text"]
NUMBERS = [name for name in SAMPLES.columns if schema.column(name).type == "number"]
FACTORS = {"m": {"(m)": 1.0, "[ft]": 0.3048, ", ft": 0.3048, "_us-ft": 1200 / 3937}, "pct": {"(%)": 1.0, ", %": 1.0}}

words = st.text(st.sampled_from("abcXYZ0189,;|\t\"'\n äß½µ.-_"), max_size=12).map(str.strip)
names = st.text(st.sampled_from("ABHTP0123456789-/ "), min_size=1, max_size=8).map(str.strip).filter(bool)
numbers = st.decimals(min_value=0, max_value=400, places=2).map(lambda value: f"{value:f}")


@st.composite
def heading(draw: st.DrawFn, column: str) -> tuple[str, float]:
    """Return a spelling of a column and the factor that it states."""
    name = draw(st.sampled_from(spellings(SAMPLES)[column]))
    units = FACTORS.get(schema.column(column).unit, {})
    factor = 1.0
    if name != column and units and draw(st.booleans()):
        unit = draw(st.sampled_from(sorted(units)))
        name, factor = name + " " * (unit[0] in "([") + unit, units[unit]
    case = draw(st.sampled_from([str, str.upper, str.title, str.lower]))
    between = draw(st.sampled_from([" ", "_", ".", "-"]))
    return case(name).replace(" ", between) if "[" not in name and "(" not in name else case(name), factor


@st.composite
def table(draw: st.DrawFn) -> tuple[list[tuple[str, str, float]], list[list[str]]]:
    """Return columns as (column, heading, factor), and rows of cells."""
    chosen = ["boring", "top_depth_m"]
    chosen += draw(st.lists(st.sampled_from([c for c in SAMPLES.columns if c not in chosen]), unique=True, max_size=6))
    columns = [(column, *draw(heading(column))) for column in chosen]
    for sieve in draw(st.lists(st.sampled_from(sorted(sieve_sizes())), unique=True, max_size=2)):
        spelling = draw(st.sampled_from(["{}", "% passing {}", "passing {} (%)", "Sieve {}"])).format(sieve)
        columns.append((passing_column(sieve_sizes()[sieve]), spelling, 1.0))
    columns = draw(st.permutations(columns))
    row = st.tuples(*(names if c == "boring" else words if c in TEXT_COLUMNS else numbers for c, *_ in columns))
    return columns, [list(cells) for cells in draw(st.lists(row, max_size=5))]


def written_and_read(rows: list[list[str]], suffix: str, **form: object) -> RawTable:
    encoding = str(form.pop("encoding", "utf-8"))
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "table" + suffix)
        with path.open("w", encoding=encoding, newline="") as stream:
            csv.writer(stream, **form).writerows(rows)  # type: ignore[arg-type]
        return for_file(borings.FORMATS, path, "test").read(path, "samples", TableOptions())


@given(
    written=table(),
    delimiter=st.sampled_from(",;\t|"),
    encoding=st.sampled_from(["utf-8", "utf-8-sig", "utf-16", "cp1252"]),
    ending=st.sampled_from(["\n", "\r\n"]),
    titles=st.integers(0, 3),
)
@settings(max_examples=60, deadline=None, suppress_health_check=[HealthCheck.too_slow])
def test_any_spelling_of_a_table_reads_back_as_the_same_cells(
    written: tuple[list[tuple[str, str, float]], list[list[str]]],
    delimiter: str,
    encoding: str,
    ending: str,
    titles: int,
) -> None:
    columns, rows = written
    above = [["Laboratory report"]] * titles
    lines = [*above, [spelled for _, spelled, _ in columns], *rows]
    found = written_and_read(lines, ".csv", delimiter=delimiter, encoding=encoding, lineterminator=ending)
    assert [(h.column, h.found) for h in found.headings.values()] == [(c, spelled) for c, spelled, _ in columns]
    for column, _, factor in columns:
        assert abs(found.headings[column].factor - factor) <= 1e-12 * factor
    expected = [[cell if cell.strip() else None for cell in row] for row in rows]
    cells = found.cells.astype(object).where(found.cells.notna(), None)
    assert cells.values.tolist() == expected
    assert found.original.values.tolist() == rows
    assert found.cells.index.tolist() == list(range(titles + 2, titles + 2 + len(rows)))


@given(content=st.binary(max_size=300), suffix=st.sampled_from([".csv", ".xlsx", ".gpkg", ".geojson", ".shp"]))
@settings(max_examples=150, deadline=None)
def test_no_bytes_raise_anything_but_an_error_that_a_user_can_act_on(content: bytes, suffix: str) -> None:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder, "table" + suffix)
        path.write_bytes(content)
        message = "table: read"
        try:
            for_file(borings.FORMATS, path, "test").read(path, "samples", TableOptions())
        except GeomapError as error:
            message = str(error)
        assert message.startswith("table")


@given(st.lists(st.lists(st.text(max_size=6), max_size=5), min_size=1, max_size=5))
@settings(max_examples=100, deadline=None)
def test_no_text_table_raises_anything_but_an_error_that_a_user_can_act_on(rows: list[list[str]]) -> None:
    with contextlib.suppress(GeomapError, UnicodeEncodeError):
        found = written_and_read(rows, ".csv")
        assert found.cells["boring"].notna().sum() <= len(rows)


@given(st.text(max_size=40))
@settings(max_examples=300, deadline=None)
def test_a_size_read_from_any_heading_is_a_size(heading_text: str) -> None:
    size = size_from_heading(heading_text)
    assert size is None or 0 < size <= 3000
