"""The whole job on a small corridor: what any two outputs must agree on, and what must never happen."""

from __future__ import annotations

import hashlib
import json
import shutil
from pathlib import Path

import geopandas
import numpy as np
import pandas as pd
import pyogrio
import pytest

import geomap
from geomap.errors import InputError, UsageError
from geomap.pipeline import run_and_write
from geomap.results import Results
from geomap.tables import schema
from tests.corridor import small


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return small.write(tmp_path_factory.mktemp("corridor"))


@pytest.fixture(scope="module")
def done(folder: Path) -> tuple[Results, list[Path]]:
    return run_and_write(folder)


@pytest.fixture(scope="module")
def results(done: tuple[Results, list[Path]]) -> Results:
    return done[0]


def test_no_row_vanishes(results: Results) -> None:
    counts = results.tables["counts"].set_index("table")
    assert (counts["read"] == counts["used"] + counts["left_out"]).all()
    for name, (_, rows) in small.TABLES.items():
        if name != "line.csv":
            assert counts.loc[name.removesuffix(".csv"), "read"] == len(rows)
    assert len(results.tables["borings"]) == 4
    assert len(results.tables["samples"]) == 7


def test_the_boring_outside_is_left_out_with_its_reason_and_its_sample(results: Results) -> None:
    borings = results.tables["borings"].set_index("boring")
    assert borings.loc["A-4", "status"] == "left out"
    assert borings.loc["A-4", "reason"]
    samples = results.tables["samples"]
    assert samples.loc[samples["boring"] == "A-4", "status"].tolist() == ["left out"]
    assert "A-4" not in results.tables["trace"]["boring"].tolist()


def test_classes_are_those_of_the_standards(results: Results) -> None:
    samples = results.tables["samples"].set_index(["boring", "sample"])
    assert samples.loc[("A-1", "S1"), "uscs_name"] == "lean clay with sand"  # 82 % fines, LL 38, PI 19
    assert samples.loc[("A-1", "S1"), "aashto_group"] == "A-6"
    assert samples.loc[("A-1", "S1"), "group_index"] == 15  # (82-35)(.2+.005(38-40)) + .01(82-15)(19-10) = 14.96
    assert samples.loc[("A-2", "S1"), "uscs_symbol"] == "CH"
    assert samples.loc[("A-2", "S2"), "uscs_symbol"] == "SM"
    peat = samples.loc[("A-3", "S2")]
    assert (peat["uscs_symbol"], peat["aashto_group"], peat["uscs_symbol_basis"]) == ("PT", "A-8", "visual")
    assert peat["suitability"] == "unsuitable"


def test_a_censored_value_keeps_its_sign(results: Results) -> None:
    samples = results.tables["samples"].set_index(["boring", "sample"])
    row = samples.loc[("A-2", "S1")]
    assert (row["cbr_soaked_pct"], row["cbr_soaked_pct_bound"]) == (2.0, "<")


def test_steps_tile_the_alignment_and_their_probabilities_add_to_one(results: Results) -> None:
    steps = results.tables["subgrade"]
    assert steps["from_distance_m"].iloc[0] == 0
    assert steps["to_distance_m"].iloc[-1] == pytest.approx(600)
    assert (steps["from_distance_m"].iloc[1:].to_numpy() == steps["to_distance_m"].iloc[:-1].to_numpy()).all()
    shares = steps[["p_suitable", "p_treat", "p_unsuitable", "p_not_assessed"]].sum(axis=1)
    np.testing.assert_allclose(shares, 1.0, atol=1e-9)
    lengths = [g.length for g in steps["geometry"]]
    np.testing.assert_allclose(sum(lengths), 600)


def test_chainage_labels_jump_at_the_equation_and_distance_does_not(results: Results) -> None:
    steps = results.tables["subgrade"].set_index("from_distance_m")
    assert steps.loc[290.0, ["from_chainage", "to_chainage"]].tolist() == ["1+290", "1+350"]
    assert steps.loc[300.0, "from_chainage"] == "1+350"


def test_cut_fill_and_material_follow_from_the_levels(results: Results) -> None:
    steps = results.tables["subgrade"].set_index("from_distance_m")
    first, last = steps.loc[0.0], steps.loc[590.0]
    assert first["cut_fill_m"] == pytest.approx(-0.5, abs=0.02)
    assert first["subgrade_material"] == "natural"
    assert last["cut_fill_m"] == pytest.approx(1.66, abs=0.05)
    assert last["subgrade_material"] == "imported"
    assert last["suitability"] == "not assessed"
    assert last["rule"] == "not assessed: imported fill"


def test_p_unsuitable_is_the_share_of_draws(results: Results) -> None:
    steps = results.tables["subgrade"]
    unsuitable = results.legend.query("system == 'suitability' and symbol == 'unsuitable'")["code"].iloc[0]
    natural = (steps["subgrade_material"] == "natural").to_numpy()
    assert results.draws.shape == (60, 40)
    np.testing.assert_allclose(
        (results.draws[natural] == unsuitable).mean(axis=1), steps.loc[natural, "p_unsuitable"], atol=1e-12
    )


def test_odds_of_every_cell_add_to_one_in_every_system(results: Results) -> None:
    cells = results.tables["profile_cells"]
    for system in ("astm_d2487", "aashto_m145", "usda_texture"):
        totals = [sum(json.loads(text).values()) for text in cells[f"{system}_odds"]]
        assert max(abs(t - 1) for t in totals) <= 0.01
    lead = cells.iloc[0]
    assert json.loads(lead["astm_d2487_odds"])[lead["soil_group"]] == pytest.approx(lead["probability"], abs=1e-4)


def test_topsoil_never_votes_below_the_layer_that_the_log_gives_it(results: Results) -> None:
    cells = results.tables["profile_cells"]
    beside = cells[(cells["from_distance_m"] == 100) & (cells["top_depth_m"] >= 0.5)]
    assert len(beside) == 5
    assert all(json.loads(text).get("OL", 0) < 0.02 for text in beside["astm_d2487_odds"])


def test_every_trace_row_resolves_to_a_row_of_an_input_file(results: Results, folder: Path) -> None:
    trace = results.tables["trace"]
    assert len(trace)
    lines = {name: (folder / name).read_text("utf-8").splitlines() for name in trace["file"].unique()}
    for row in trace.itertuples():
        assert lines[row.file][row.row_number - 1].startswith(f"{row.boring},")
    assert (trace["weight"] <= 1).all()


def test_layers_conform_to_their_layouts_and_open_in_geopandas(
    results: Results, done: tuple[Results, list[Path]]
) -> None:
    package = next(f for f in done[1] if f.suffix == ".gpkg")
    written = {name for name, _ in pyogrio.list_layers(package)}
    for name, layout in schema.layers().items():
        assert name in written
        frame = geopandas.read_file(package, layer=name)
        assert len(frame) == len(results.tables[name])
        assert set(layout.columns) <= set(frame.columns)


def test_page_and_schedule_and_layer_tell_the_same_suitability(done: tuple[Results, list[Path]]) -> None:
    results, files = done
    schedule = pd.read_csv(next(f for f in files if f.name == "subgrade.csv"), encoding="utf-8-sig")
    steps = results.tables["subgrade"].assign(length=lambda t: t["to_distance_m"] - t["from_distance_m"])
    by_step = steps.groupby("suitability")["length"].sum()
    by_stretch = schedule.dropna(subset=["Suitability"]).groupby("Suitability")["Length (m)"].sum()
    pd.testing.assert_series_equal(by_step, by_stretch, check_names=False, check_index_type=False)
    summary = results.summary()
    assert {w: by_step.get(w, 0.0) for w in ("suitable", "treat", "unsuitable", "not assessed")} == {
        w: summary[f"length_{w.replace(' ', '_')}_m"] for w in ("suitable", "treat", "unsuitable", "not assessed")
    }


def test_a_second_run_writes_the_same_bytes(folder: Path, done: tuple[Results, list[Path]]) -> None:
    before = {f: hashlib.sha256(f.read_bytes()).hexdigest() for f in done[1]}
    _, files = run_and_write(folder)
    assert {f: hashlib.sha256(f.read_bytes()).hexdigest() for f in files} == before


def test_the_input_files_are_never_touched(tmp_path: Path) -> None:
    folder = small.write(tmp_path)
    before = {f.name: f.read_bytes() for f in folder.iterdir()}
    run_and_write(folder)
    assert {f.name: f.read_bytes() for f in folder.iterdir() if f.is_file()} == before


def test_blocked_input_leaves_old_outputs_as_they_are(tmp_path: Path) -> None:
    folder = small.write(tmp_path)
    _, files = run_and_write(folder)
    before = {f: f.read_bytes() for f in files}
    small.write(folder, small.CORRIDOR.replace("EPSG:32633", "EPSG:32733"), {})  # the line is read, and the borings too
    head, rows = small.TABLES["borings.csv"]
    far = [(name, x + 200_000, *rest) for name, x, *rest in rows]
    small.write(folder, small.CORRIDOR, {"borings.csv": (head, far)})
    with pytest.raises(InputError, match="crs"):
        run_and_write(folder)
    assert {f: f.read_bytes() for f in files} == before


VARIANTS = {
    "without formation": small.CORRIDOR.replace('[formation]\nfile = "formation.csv"\nreference = "formation"\n', ""),
    "without ground": small.CORRIDOR.replace('[ground]\nfile = "ground.csv"\n', ""),
    "without strata": small.CORRIDOR.replace('[strata]\nfile = "strata.csv"\n', ""),
    "without gradations": small.CORRIDOR.replace('[gradations]\nfile = "gradations.csv"\n', ""),
    "one system": small.CORRIDOR.replace('"astm_d2487", "aashto_m145", "usda_texture"', '"aashto_m145"'),
    "with fill": small.CORRIDOR + '[fill]\ngroup = "CH"\n',
    "long steps": small.CORRIDOR.replace("[profile]", "[profile]\nstep_m = 250"),
    "given ranges": small.CORRIDOR.replace(
        "[estimation]", "[estimation]\nhorizontal_range_m = 90\nvertical_range_m = 1"
    ),
    "pipeline": small.CORRIDOR.replace('crs = "EPSG', 'use = "pipeline"\ncrs = "EPSG'),
}


@pytest.mark.parametrize("name", VARIANTS)
def test_a_corridor_may_lack_what_is_optional(name: str, tmp_path: Path) -> None:
    folder = small.write(tmp_path, VARIANTS[name])
    results, files = run_and_write(folder)
    steps = results.tables["subgrade"]
    assert all(f.stat().st_size for f in files)
    shares = steps[["p_suitable", "p_treat", "p_unsuitable", "p_not_assessed"]].sum(axis=1)
    np.testing.assert_allclose(shares, 1.0)
    if name == "without formation":
        assert (steps["p_not_assessed"] == 1).all()
        assert steps["cut_fill_m"].isna().all()
        assert steps["soil_group"].notna().all()
    if name == "without ground":
        assert "collar levels" in results.run_value("ground levels")
    if name == "with fill":
        last = steps.iloc[-1]
        assert (last["soil_group"], last["suitability"]) == ("CH", "treat")
    if name == "given ranges":
        assert "90 m along and across the line (given)" in results.run_value("estimation")


def borings_cut(count: int) -> dict[str, tuple[object, object]]:
    head, rows = small.TABLES["borings.csv"]
    return {**small.TABLES, "borings.csv": (head, rows[:count])}


@pytest.mark.parametrize("count", [1, 2])
def test_few_borings_give_an_answer_that_admits_what_it_does_not_know(count: int, tmp_path: Path) -> None:
    results = geomap.run(small.write(tmp_path, tables=borings_cut(count)))
    evidence = results.tables["subgrade"]["evidence"]
    assert (evidence == "no data").sum() > (60 if count == 1 else 20) * 0.3


def test_no_boring_at_all_is_refused_in_words(tmp_path: Path) -> None:
    with pytest.raises(InputError):
        geomap.run(small.write(tmp_path, tables=borings_cut(0)))


def test_us_survey_feet_and_stations_by_the_hundred(tmp_path: Path) -> None:
    foot = 1200 / 3937
    tables = dict(small.TABLES)
    east, north = 1_000_000, 200_000
    tables["line.csv"] = (("x", "y"), [(east, north), (east + 2000, north)])
    _head, rows = small.TABLES["borings.csv"]
    moved = [
        (n, east + (x - small.X) / foot, north + (y - small.Y) / foot, z / foot, d / foot, t)
        for n, x, y, z, d, t in rows
    ]
    tables["borings.csv"] = (("boring", "x", "y", "Elevation (US-ft)", "Depth (US-ft)", "date"), moved)
    tables["formation.csv"] = (("station", "level_m"), [("10+00", 19.5), ("30+00", 20.5)])
    text = small.CORRIDOR.replace("EPSG:32633", "EPSG:2263").replace(
        "equations = [{ back = 1300.0, ahead = 1350.0 }]\n", ""
    )
    text = text.replace("half_width_m = 50", 'half_width_m = 50\nlength_unit = "us-ft"\nchainage_format = "0+00"')
    results = geomap.run(small.write(tmp_path, text, tables))
    borings = results.tables["borings"].set_index("boring")
    assert borings.loc["A-1", "distance_m"] == pytest.approx(105, abs=0.01)
    assert borings.loc["A-1", "offset_m"] == pytest.approx(-3, abs=0.01)
    assert borings.loc["A-1", "ground_level_m"] == pytest.approx(20.0, abs=1e-6)
    assert results.tables["alignment"]["length_m"].iloc[0] == pytest.approx(2000 * foot)
    assert results.tables["subgrade"]["from_chainage"].iloc[0] == "10+00"


HOSTILE = [
    "{{7*7}}",
    "</script><script>alert(1)</script>",
    "=cmd|x",
    "B" * 300,
    "\u202eABC\u202c عربى",
    "a'; drop table x",
]


@pytest.mark.parametrize("name", HOSTILE, ids=["template", "script", "formula", "long", "right to left", "sql"])
def test_a_hostile_boring_name_is_kept_and_harmless_in_every_output(name: str, tmp_path: Path) -> None:
    tables = {
        file: (head, [[name if cell == "A-1" else cell for cell in row] for row in rows])
        for file, (head, rows) in small.TABLES.items()
    }
    corridor = small.CORRIDOR.replace('"Small line"', json.dumps(f"Line {name}"[:200]))
    results, files = run_and_write(small.write(tmp_path, corridor, tables))
    assert name in results.tables["borings"]["boring"].tolist()
    assert all(f.resolve().is_relative_to(tmp_path / "out") for f in files)
    page = next(f for f in files if f.suffix == ".html").read_text("utf-8")
    assert "<script>alert(1)" not in page
    package = next(f for f in files if f.suffix == ".gpkg")
    assert name in geopandas.read_file(package, layer="borings")["boring"].tolist()
    for schedule in (f for f in files if f.suffix == ".csv"):
        cells = pd.read_csv(schedule, encoding="utf-8-sig", dtype=str, header=None).to_numpy().ravel()
        assert not [c for c in cells if isinstance(c, str) and c.startswith(("=", "@", "+cmd", "-cmd"))]


def test_an_output_folder_that_is_a_file_is_refused_before_any_work(tmp_path: Path) -> None:
    folder = small.write(tmp_path)
    (folder / "out").write_text("x")
    with pytest.raises(UsageError, match="a folder"):
        run_and_write(folder)


def test_a_killed_run_leaves_the_old_outputs_whole(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = small.write(tmp_path)
    _, files = run_and_write(folder)
    before = {f: f.read_bytes() for f in files}

    def fail(*_: object) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr("geomap.exports.schedules.write", fail)
    with pytest.raises(KeyboardInterrupt):
        run_and_write(folder)
    assert {f: f.read_bytes() for f in files} == before
    assert not [p for p in (folder / "out").iterdir() if p.name.startswith(".")]
    shutil.rmtree(folder / "out")
