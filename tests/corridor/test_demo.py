"""The demo corridor: it can be invented again, it runs, and its findings are the planted ones."""

from __future__ import annotations

import hashlib
import json
import os
import subprocess
import sys
from pathlib import Path

import pytest

import geomap
from geomap.results import Results

DEMO = Path(geomap.__file__).parents[1] / "demo_corridor"
pytestmark = pytest.mark.skipif(not DEMO.is_dir(), reason="an installed geomap has no demo beside it")


@pytest.fixture(scope="module")
def results() -> Results:
    return geomap.run(DEMO)


def test_the_files_are_invented_again_byte_for_byte(tmp_path: Path) -> None:
    environment = {**os.environ, "PYTHONDONTWRITEBYTECODE": "1"}
    subprocess.run([sys.executable, str(DEMO / "invent.py"), str(tmp_path)], check=True, env=environment)
    written = {f.name: hashlib.sha256(f.read_bytes()).hexdigest() for f in tmp_path.iterdir()}
    assert len(written) >= 7
    assert written == {name: hashlib.sha256((DEMO / name).read_bytes()).hexdigest() for name in written}


def test_the_findings_are_the_planted_faults_and_what_follows_from_them(results: Results) -> None:
    found = results.tables["findings"]
    asked = found[found["severity"] != "note"]
    planted = {
        ("samples.csv", "BH-09"),  # LL below PL
        ("gradations.csv", "BH-06"),  # not monotone
        ("samples.csv", "BH-05"),  # below the end of the hole
        ("strata.csv", "BH-15"),  # a gap
        ("samples.csv", "TP-08"),  # top below base
        ("samples.csv", "BH-08"),  # SM in the field, CL in the laboratory
        ("borings.csv", "BH-14"),  # ground level 0
        ("samples.csv", "TP-09"),  # a date for a name
        ("samples.csv", "TP-06"),  # CBR without soak state
        ("borings.csv", "BH-11"),  # outside the corridor
    }
    assert set(zip(asked["file"], asked["boring"], strict=True)) == planted
    assert len(asked) == len(planted)
    notes = found[found["severity"] == "note"]
    assert {"BH-02", "BH-13"} <= set(notes["boring"].dropna())  # NP as 0, moisture as -999


def test_the_corridor_has_what_its_readme_promises(results: Results) -> None:
    borings, samples, steps = (results.tables[name] for name in ("borings", "samples", "subgrade"))
    assert len(borings) >= 40
    assert len(samples) >= 200
    assert 6000 <= results.tables["alignment"]["length_m"].iloc[0] <= 10_000
    groups = set(samples["uscs_symbol"].dropna())
    assert {"PT", "CH", "GM", "SP", "CL", "ML", "OH"} <= groups
    assert set(samples["origin"].dropna()) >= {"natural", "made ground", "weathered rock"}
    assert set(steps["subgrade_material"].dropna()) == {"natural", "imported", "mixed"}
    assert steps["cut_fill_m"].min() < -4
    assert steps["cut_fill_m"].max() > 3
    assert len(results.chainage_breaks) == 2


def test_tests_on_one_soil_agree(results: Results) -> None:
    samples = results.tables["samples"]
    used = samples[samples["status"] == "used"]
    limits = used.dropna(subset=["liquid_limit_pct", "plastic_limit_pct"])
    index = limits["liquid_limit_pct"] - limits["plastic_limit_pct"]
    assert (index <= 0.9 * (limits["liquid_limit_pct"] - 8) + 1).all()  # U-line, ASTM D2487, from memory
    assert (used["passing_0_075_mm_pct"] <= used["passing_4_75_mm_pct"] + 1e-9).sum() > 200


def test_peat_beneath_the_embankment_is_estimated_as_peat(results: Results) -> None:
    cells, steps = results.tables["profile_cells"], results.tables["subgrade"]
    deepest = steps.loc[steps["cut_fill_m"].idxmax(), "from_distance_m"]
    column = cells[(cells["from_distance_m"] == deepest) & cells["top_depth_m"].between(0.5, 1.5)]
    assert all(json.loads(odds).get("PT", 0) > 0.5 for odds in column["astm_d2487_odds"])


def test_the_cut_in_weathered_rock_is_suitable_and_the_fat_clay_is_not(results: Results) -> None:
    steps = results.tables["subgrade"].set_index("from_distance_m")
    assert (steps.loc[5700:6000, "suitability"] == "suitable").mean() > 0.9
    assert (steps.loc[3300:3600, "suitability"] == "suitable").mean() < 0.1
