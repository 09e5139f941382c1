"""Schedules open in a spreadsheet, add up, carry the cautions, and run nothing."""

from __future__ import annotations

import csv
import dataclasses
import io
import re
from pathlib import Path

import numpy as np
import pandas as pd
import pytest

from geomap.exports import schedules
from geomap.exports.stretches import stretches
from geomap.exports.texts import file_stem
from geomap.results import Results
from tests.unit.exports.sample import STEP_M, STEPS, sample_results

NAMES = ["subgrade.csv", "borings.csv", "samples.csv", "findings.csv", "about.csv"]
HOSTILE = ("{{7*7}}", "</script><script>alert(1)</script>", "=cmd|' /C calc'!A0", "+1+1", "-1+1", "@x", "\t=1", "\r=1")


def read(path: Path) -> list[list[str]]:
    return list(csv.reader(io.StringIO(path.read_bytes().decode("utf-8-sig"), newline="")))


def target(folder: Path) -> Path:
    """Return the only folder of schedules in a folder."""
    (found,) = folder.glob("*_schedules")
    return found


def table(path: Path) -> pd.DataFrame:
    """Return the rows above the foot."""
    head, *rows = read(path)
    return pd.DataFrame(rows[: rows.index([])], columns=head)


@pytest.fixture(scope="module")
def folder(results: Results, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("schedules")
    written = folder / f"{file_stem(results.name)}_schedules"
    assert schedules.write(results, folder) == [written / name for name in NAMES]
    return written


@pytest.mark.parametrize("name", NAMES)
def test_files_are_utf8_with_a_mark_and_lines_end_as_rfc_4180_asks(folder: Path, name: str) -> None:
    content = (folder / name).read_bytes()
    assert content.startswith(b"\xef\xbb\xbf")
    assert content.count(b"\n") == content.count(b"\r\n")
    assert content.endswith(b"\r\n")


@pytest.mark.parametrize("name", NAMES[:4])
def test_headings_come_first_and_issue_and_cautions_last(folder: Path, results: Results, name: str) -> None:
    rows = read(folder / name)
    assert all(rows[0])
    assert rows[-2] == []
    assert len(rows[-1]) == 1
    assert rows[-1][0].startswith("Issue A, for review.")
    assert all(caution in rows[-1][0] for caution in results.cautions)


def test_about_says_issue_cautions_counts_and_run(folder: Path, results: Results) -> None:
    rows = read(folder / "about.csv")
    assert ["Issue", "A, for review"] in rows
    assert all(["Caution", caution] in rows for caution in results.cautions)
    assert ["Count of borings", "4 read, 3 used, 1 left out"] in rows
    assert ["seed", "1"] in rows


class TestSubgrade:
    """Steps are merged into stretches with one answer."""

    def test_stretches_cover_the_alignment_once(self, folder: Path) -> None:
        rows = table(folder / "subgrade.csv")
        start, end = rows["From (m)"].astype(float).to_numpy(), rows["To (m)"].astype(float).to_numpy()
        assert (start[0], end[-1]) == (0.0, STEPS * STEP_M)
        assert (start[1:] == end[:-1]).all()
        np.testing.assert_allclose(rows["Length (m)"].astype(float), end - start)
        assert len(rows) < STEPS / 2

    def test_a_stretch_has_one_answer_and_the_range_of_its_steps(self, results: Results) -> None:
        steps = results.tables["subgrade"]
        for row in stretches(steps).to_dict("records"):
            of = steps[(steps["from_distance_m"] >= row["From (m)"]) & (steps["to_distance_m"] <= row["To (m)"])]
            for heading, column in [
                ("Soil group", "soil_group"),
                ("Suitability", "suitability"),
                ("Evidence", "evidence"),
                ("Subgrade material", "subgrade_material"),
            ]:
                assert of[column].fillna("").nunique() == 1
                assert pd.isna(row[heading]) or row[heading] == of[column].iloc[0]
            assert row["P unsuitable, highest"] == of["p_unsuitable"].max()
            assert row["Cut or fill, lowest (m)"] == of["cut_fill_m"].min()
            assert row["Cut or fill, highest (m)"] == of["cut_fill_m"].max()
            assert row["Nearest borings"] == ", ".join(of["nearest_boring"].unique())

    def test_neighbors_differ_unless_a_chainage_equation_parts_them(self, results: Results) -> None:
        rows = stretches(results.tables["subgrade"])
        keys = ["Subgrade material", "Soil group", "AASHTO group", "Suitability", "Evidence", "Rule"]
        answer = rows[keys].astype("object").fillna("")
        same = [k for k in range(1, len(rows)) if (answer.iloc[k] == answer.iloc[k - 1]).all()]
        parted = [k for k in range(1, len(rows)) if rows["To chainage"][k - 1] != rows["From chainage"][k]]
        assert set(same) <= set(parted)
        assert [(rows["To chainage"][k - 1], rows["From chainage"][k]) for k in parted] == [("12+300", "12+350")]

    def test_a_gap_parts_a_stretch_and_order_does_not_matter(self) -> None:
        steps = pd.DataFrame(  # constructed: three steps alike, the third beyond a gap
            {
                "from_distance_m": [30.0, 10.0, 0.0],
                "to_distance_m": [40.0, 20.0, 10.0],
                "from_chainage": ["0+030", "0+010", "0+000"],
                "to_chainage": ["0+040", "0+020", "0+010"],
                "cut_fill_m": [1.0, -1.0, -2.0],
                "probability": [0.5, 0.6, 0.7],
                "p_unsuitable": [0.0, 0.1, 0.2],
                "nearest_boring": ["B", "A", "A"],
                **dict.fromkeys(["subgrade_material", "soil_group", "aashto_group", "suitability"], "same"),
                **dict.fromkeys(["evidence", "rule"], "same"),
                "cbr_mid_pct": [np.nan, 4.0, 6.0],
            }
        )
        rows = stretches(steps)
        assert rows["From chainage"].tolist() == ["0+000", "0+030"]
        assert rows["Length (m)"].tolist() == [20.0, 10.0]
        assert rows["Cut or fill, lowest (m)"].tolist() == [-2.0, 1.0]
        assert rows["CBR mid, highest (%)"].iloc[0] == 6.0

    def test_without_steps_there_are_headings(self, results: Results, tmp_path: Path) -> None:
        tables = {name: table for name, table in results.tables.items() if name != "subgrade"}
        schedules.write(dataclasses.replace(results, tables=tables), tmp_path)
        assert len(table(target(tmp_path) / "subgrade.csv")) == 0


class TestUnits:
    """Lengths are in the unit of the corridor, and the heading says so."""

    @pytest.mark.parametrize(("unit", "factor"), [("ft", 0.3048), ("us-ft", 1200 / 3937)])
    def test_lengths_are_converted_with_their_heading(self, tmp_path: Path, unit: str, factor: float) -> None:
        results = sample_results(length_unit=unit)
        schedules.write(results, tmp_path)
        borings = table(target(tmp_path) / "borings.csv")
        assert not [heading for heading in borings.columns if heading.endswith("(m)")]
        expected = results.tables["borings"]["distance_m"].to_numpy() / factor
        np.testing.assert_allclose(borings[f"Distance ({unit})"].astype(float), expected, atol=0.0005)
        stretched = table(target(tmp_path) / "subgrade.csv")
        assert stretched[f"Length ({unit})"].astype(float).sum() == pytest.approx(600 / factor, abs=0.02)

    def test_other_quantities_are_not(self, tmp_path: Path, folder: Path) -> None:
        schedules.write(sample_results(length_unit="ft"), tmp_path)
        in_feet = table(target(tmp_path) / "samples.csv")
        assert in_feet["Fines (%)"].tolist() == table(folder / "samples.csv")["Fines (%)"].tolist()


class TestSamples:
    """Values read as a lab sheet writes them."""

    def test_nonplastic_and_censored_values(self, folder: Path) -> None:
        rows = table(folder / "samples.csv").set_index(["Boring", "Sample"])
        assert rows.loc[("BH-1", "S4"), "Liquid limit (%)"] == "NP"
        assert rows.loc[("BH-1", "S4"), "CBR, soaked (%)"] == ">100"
        assert rows.loc[("BH-2", "S1"), "CBR, soaked (%)"] == "<2"
        assert rows.loc[("BH-1", "S1"), "Liquid limit (%)"] == "34.0"
        assert rows.loc[("BH-3", "S3"), "USCS symbol"] == ""
        assert rows.loc[("BH-3", "S3"), "USCS reason"] == "fines_pct is missing"


def test_two_corridors_in_one_folder_keep_their_own_schedules(tmp_path: Path) -> None:
    paths = [path for name in ("Line A", "Line B") for path in schedules.write(sample_results(name=name), tmp_path)]
    assert len(set(paths)) == 2 * len(NAMES)
    assert all(path.exists() for path in paths)


def test_a_chainage_before_zero_starts_no_formula_and_has_no_apostrophe() -> None:
    rows = pd.DataFrame({"Chainage": ["-0+500", "0+000", "-1+2+3", None], "Boring": ["-0+500", "0+000", "B", "C"]})
    lines = schedules.csv_text(rows).split("\r\n")
    assert lines[1:5] == ["\u22120+500,'-0+500", "0+000,0+000", "'-1+2+3,B", ",C"]


@pytest.mark.parametrize("word", HOSTILE)
def test_no_cell_starts_a_formula_and_numbers_stay_numbers(word: str, tmp_path: Path) -> None:
    results = sample_results(name=word, first=word)
    schedules.write(dataclasses.replace(results, issue=word), tmp_path)
    for name in NAMES:
        for row in read(target(tmp_path) / name):
            for cell in row:
                assert not re.match(r"[\s]*[=+@]|[\t\r]", cell), cell
                assert not cell.startswith("-") or re.fullmatch(r"-[\d.e-]+", cell)
    borings = table(target(tmp_path) / "borings.csv")
    assert (borings["Offset (m)"].astype(float) < 0).any()
    assert borings["Boring"].iloc[0].lstrip("'") == word


def test_the_same_results_give_the_same_bytes(folder: Path, results: Results, tmp_path: Path) -> None:
    for path in schedules.write(results, tmp_path):
        assert path.read_bytes() == (folder / path.name).read_bytes()
