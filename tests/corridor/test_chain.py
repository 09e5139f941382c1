"""From a cell of an input file to a verdict along the line: links that must hold."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path

import numpy as np
import pytest

import geomap
from geomap.errors import UsageError
from tests.corridor import small

SAMPLES = (
    *("boring", "sample", "top_depth_m", "base_depth_m", "visual_group", "origin", "unit"),
    *("passing_4_75_mm_pct", "passing_0_075_mm_pct", "LL", "PL", "swell_pct", "lab_sheet"),
)
BARE = {
    "line.csv": small.TABLES["line.csv"],
    "borings.csv": small.TABLES["borings.csv"],
    "strata.csv": (small.TABLES["strata.csv"][0], []),
}
CORRIDOR = "".join(
    part
    for part in small.CORRIDOR.replace("[", "\0[").split("\0")
    if not part.startswith(("[ground]", "[formation]", "[gradations]"))
)


def job(folder: Path, samples: Sequence[tuple], strata: Sequence[tuple] = (), corridor: str = CORRIDOR) -> Path:
    tables = {**BARE, "samples.csv": (SAMPLES, samples), "strata.csv": (BARE["strata.csv"][0], strata)}
    return small.write(folder, corridor, tables)


def test_a_left_out_sample_gets_no_class_from_anything_else(tmp_path: Path) -> None:
    samples = [
        ("A-1", "S1", 0.5, 1.0, "CL", "", "", "", "", "", "", "", ""),
        ("A-1", "S9", 30.0, 30.5, "SM", "", "", "", "", "", "", "", ""),  # far below the end of the hole
    ]
    results = geomap.run(job(tmp_path, samples, [("A-2", 0, 4, "PT", "natural", "")]))
    row = results.tables["samples"].set_index("sample").loc["S9"]
    assert row["status"] == "left out"
    assert row[["uscs_symbol", "suitability", "rule"]].isna().all()


def test_soil_without_class_is_not_answered_for_by_soil_from_afar(tmp_path: Path) -> None:
    clayey = [("A-1", f"S{k}", 0.4 * k, 0.4 * k + 0.3, "", "", "", 100, 92, "", "", "", "") for k in range(10)]
    results = geomap.run(job(tmp_path, [*clayey, ("A-3", "S1", 0.0, 4.0, "SP", "", "", "", "", "", "", "", "")]))
    steps = results.tables["subgrade"].set_index("from_distance_m")
    assert steps.loc[100.0, "evidence"] == "observed"
    assert steps.loc[100.0, "soil_group"] == "n/d"


def test_limits_from_one_sheet_and_gradation_from_another_are_one_soil_traced_to_both(tmp_path: Path) -> None:
    samples = [
        ("A-1", "SIEVE", 0.0, 1.0, "", "", "", 100, 92, "", "", "", "L-1"),
        ("A-1", "LIMITS", 0.1, 1.0, "", "topsoil", "", "", "", 60, 22, "", "L-2"),
    ]
    results = geomap.run(job(tmp_path, samples))
    rows = results.tables["samples"].set_index("sample")
    assert rows["uscs_symbol"].tolist() == ["CH", "CH"]
    assert rows["suitability"].tolist() == ["unsuitable", "unsuitable"]  # topsoil, said on one row only
    assert rows["specimen"].nunique() == 1
    trace = results.tables["trace"]
    at_hole = trace[trace["step"] == 11]
    assert set(at_hole["lab_sheet"]) == {"L-1", "L-2"}
    assert at_hole["weight"].nunique() == 1


RULES = """
title = "Own set"
source = "the project's geotechnical engineer, invented for this test"
edition = "2026"
jurisdiction = "this corridor"
flag = "invented"
applies_to = "in_place"
[thresholds]
suitable_p_unsuitable_below = 0.001
[[rules]] # a comment
id = "swell"
clause = "4.2"
when = "swell_pct > 3"
result = "unsuitable"
when_missing = "not_met"
[[rules]]
id = "rest"
clause = "4.3"
when = "True"
result = "suitable"
"""


def test_a_rule_may_look_at_any_test_of_the_sample_and_set_its_own_limits(tmp_path: Path) -> None:
    corridor = CORRIDOR + '[subgrade]\nrules = ["own.toml"]\n'
    samples = [
        ("A-1", "S1", 0.0, 4.0, "CL", "", "", "", "", "", "", 5.0, ""),
        ("A-3", "S1", 0.0, 4.0, "CL", "", "", "", "", "", "", 1.0, ""),
    ]
    folder = job(tmp_path, samples, corridor=corridor)
    (folder / "own.toml").write_text(RULES)
    results = geomap.run(folder)
    rated = results.tables["samples"].set_index("boring")["suitability"]
    assert rated.to_dict() == {"A-1": "unsuitable", "A-3": "suitable"}
    assert "below 0.001" in results.run_value("verdict limits")


def test_a_zone_thinner_than_its_cells_is_refused(tmp_path: Path) -> None:
    corridor = CORRIDOR.replace("thickness_m = 0.5", "thickness_m = 1.5")
    with pytest.raises(UsageError, match="thickness_m"):
        geomap.run(job(tmp_path, [("A-1", "S1", 0.0, 3.0, "PT", "", "", "", "", "", "", "", "")], corridor=corridor))


def test_steps_without_data_are_not_assessed_whatever_the_background_says(tmp_path: Path) -> None:
    corridor = small.CORRIDOR
    head, rows = small.TABLES["borings.csv"]
    tables = {
        **small.TABLES,
        "borings.csv": (head, rows[:1]),
        "formation.csv": (("distance_m", "level_m"), [(0, 19.4), (600, 20.4)]),
    }
    tables["line.csv"] = (("x", "y"), [(small.X, small.Y), (small.X + 600, small.Y)])
    steps = geomap.run(small.write(tmp_path, corridor, tables)).tables["subgrade"]
    blank = steps[steps["evidence"] == "no data"]
    assert len(blank) > 10
    assert (blank["suitability"] == "not assessed").all()
    assert blank["rule"].str.contains("no boring bears").all()


def test_weights_and_records_stand_behind_the_cells(tmp_path: Path) -> None:
    results = geomap.run(small.write(tmp_path))
    cells, records = results.tables["profile_cells"], results.tables["records"]
    assert results.weights.shape == (len(cells), len(records))
    assert (np.asarray(results.weights.sum(axis=1)) <= 1 + 1e-9).all()


def test_a_line_outside_the_area_of_its_system_is_asked_about(tmp_path: Path) -> None:
    corridor = small.CORRIDOR.replace("EPSG:32633", "EPSG:2263").replace(
        "equations", "# equations"
    )  # New York, feet; the line lies elsewhere
    gate = geomap.check(small.write(tmp_path, corridor))
    asked = gate.findings[gate.findings["topic"] == "place of the line"]
    assert "outside the area" in asked["found"].iloc[0]


def test_a_formation_far_from_the_ground_is_asked_about(tmp_path: Path) -> None:
    tables = {**small.TABLES, "formation.csv": (("distance_m", "level_m"), [(0, 65.0), (600, 65.0)])}
    gate = geomap.check(small.write(tmp_path, tables=tables))
    assert "formation far from the ground" in gate.findings["topic"].tolist()


def test_findings_about_levels_use_the_headings_of_the_file(tmp_path: Path) -> None:
    tables = {
        **small.TABLES,
        "ground.csv": (("Station", "Elevation"), [("1+000", 20.0), ("9+000", 21.0), ("1+650", 21.2)]),
    }
    gate = geomap.check(small.write(tmp_path, tables=tables))
    mine = gate.findings[gate.findings["file"] == "ground.csv"]
    assert len(mine)
    assert set(mine["heading"]) <= {"Station", "Elevation"}
