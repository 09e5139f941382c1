"""The GeoPackage is valid, complete, described, the same every time, and safe with hostile text."""

from __future__ import annotations

import dataclasses
import json
import os
import sqlite3
import subprocess
import sys
from collections.abc import Iterator
from contextlib import closing
from pathlib import Path

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import pytest
import shapely

from geomap.errors import OutputInUseError
from geomap.exports import geopackage, publish
from geomap.results import Results
from geomap.tables import schema
from tests.formats import validate_geopackage
from tests.unit.exports.sample import STEP_M, STEPS, ground_level, sample_results

SPATIAL = [name for name, layout in schema.layers().items() if layout.geometry]
PLAIN = [name for name, layout in schema.layers().items() if not layout.geometry]
HOSTILE = (
    "{{7*7}}",
    "</script><script>alert(1)</script>",
    "=cmd|' /C calc'!A0",
    "L" * 300,
    "\u202egpj.exe\u202c بئر",
    "'; DROP TABLE borings; --",
    '"x"; ATTACH "y"',
    "../../outside",
)


@pytest.fixture(scope="module")
def path(results: Results, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return the GeoPackage of the invented corridor."""
    return geopackage.write(results, tmp_path_factory.mktemp("gpkg"))[0]


@pytest.fixture
def connection(path: Path) -> Iterator[sqlite3.Connection]:
    with closing(sqlite3.connect(f"file:{path}?mode=ro", uri=True)) as opened:
        yield opened


def complaints(path: Path) -> list[str]:
    """Return what the GeoPackage validator says, its checks beyond the standard included."""
    pytest.importorskip(validate_geopackage.VALIDATOR, reason="pip install --no-deps gdal-utils")
    return validate_geopackage.complaints(path)


def changed(results: Results, **tables: pd.DataFrame) -> Results:
    return dataclasses.replace(results, tables={**results.tables, **tables})


def test_the_file_is_named_after_the_corridor_and_nothing_else_is_left(path: Path) -> None:
    assert path.name == "otter_brook_bypass.gpkg"
    assert list(path.parent.iterdir()) == [path]


def test_the_validator_has_nothing_to_say(path: Path) -> None:
    assert complaints(path) == []


def test_the_validator_does_find_faults(path: Path, tmp_path: Path) -> None:
    broken = tmp_path / "broken.gpkg"
    broken.write_bytes(path.read_bytes())
    with closing(sqlite3.connect(broken)) as spoiled:
        spoiled.execute("update gpkg_contents set last_change = 'yesterday' where table_name = 'run'")
        spoiled.commit()
    assert complaints(broken)


def test_it_says_that_it_is_a_geopackage_of_version_1_3(connection: sqlite3.Connection) -> None:
    # OGC 12-128r17, requirement 2: "GPKG" in ASCII, and 10300 for version 1.3.0
    assert connection.execute("pragma application_id").fetchone() == (0x47504B47,)
    assert connection.execute("pragma user_version").fetchone() == (10300,)
    assert connection.execute("pragma journal_mode").fetchone() == ("delete",)
    assert connection.execute("pragma integrity_check").fetchone() == ("ok",)
    assert connection.execute("pragma foreign_key_check").fetchall() == []


def test_layers_are_those_of_the_vocabulary_in_its_order_and_described(connection: sqlite3.Connection) -> None:
    contents = connection.execute("select table_name, data_type, identifier, description from gpkg_contents").fetchall()
    expected = [
        (name, "features" if layout.geometry else "attributes", layout.title, layout.meaning)
        for name, layout in schema.layers().items()
    ]
    assert contents[: len(expected)] == expected


@pytest.mark.parametrize("layer", SPATIAL)
def test_every_layer_opens_in_geopandas_with_one_geometry_type(path: Path, results: Results, layer: str) -> None:
    frame = gpd.read_file(path, layer=layer)
    assert len(frame) == len(results.tables[layer])
    assert set(frame.geom_type) == {schema.layers()[layer].geometry}
    assert [c for c in frame.columns if c in schema.layers()[layer].columns] == list(schema.layers()[layer].columns)


@pytest.mark.parametrize("layer", PLAIN)
def test_plain_tables_open_too(path: Path, results: Results, layer: str) -> None:
    assert len(gpd.read_file(path, layer=layer)) == len(results.tables[layer])


@pytest.mark.parametrize("layer", schema.layers())
def test_values_come_back_as_they_went_in(path: Path, results: Results, layer: str) -> None:
    back = pyogrio.read_dataframe(path, layer=layer, read_geometry=False)
    sent = results.tables[layer].drop(columns="geometry", errors="ignore")
    back = schema.conform(back, schema.layers()[layer])
    pd.testing.assert_frame_equal(back, schema.conform(sent, schema.layers()[layer]).reset_index(drop=True))


def test_lines_tile_the_alignment(path: Path) -> None:
    steps = gpd.read_file(path, layer="subgrade").sort_values("from_distance_m")
    line = gpd.read_file(path, layer="alignment").geometry.iloc[0]
    ends = shapely.get_coordinates(steps.geometry).reshape(len(steps), 2, 2)
    np.testing.assert_allclose(ends[1:, 0], ends[:-1, 1], atol=1e-6)
    assert steps.length.sum() == pytest.approx(shapely.force_2d(line).length, abs=1e-6)
    assert (steps["from_distance_m"].to_numpy()[1:] == steps["to_distance_m"].to_numpy()[:-1]).all()
    assert shapely.hausdorff_distance(shapely.force_2d(line), steps.geometry.union_all()) < 1e-6


def test_the_profile_is_a_section_in_an_undefined_cartesian_system(path: Path, connection: sqlite3.Connection) -> None:
    row = connection.execute("select srs_id, organization from gpkg_spatial_ref_sys where srs_id = -1").fetchone()
    assert (row[0], row[1].upper()) == (-1, "NONE")
    found = connection.execute("select table_name, srs_id from gpkg_geometry_columns").fetchall()
    assert dict(found) == {name: -1 if name == "profile_cells" else 32630 for name in SPATIAL}
    (header,) = connection.execute("select substr(geom, 1, 8) from profile_cells").fetchone()
    assert int.from_bytes(header[4:8], "little", signed=True) == -1
    cells = gpd.read_file(path, layer="profile_cells")
    assert cells.total_bounds[[0, 2]] == pytest.approx([0, STEPS * STEP_M])


class TestGroundOnTheAlignment:
    """The alignment has Z where the ground is known from end to end."""

    def test_each_vertex_carries_the_ground_level(self, path: Path) -> None:
        line = gpd.read_file(path, layer="alignment").geometry.iloc[0]
        xyz = shapely.get_coordinates(line, include_z=True)
        np.testing.assert_allclose(xyz[:, 2], ground_level(np.arange(STEPS + 1) * STEP_M))

    def test_vertices_are_added_where_the_ground_has_levels_and_the_plan_stays(self) -> None:
        line = shapely.linestrings([(0, 0), (60, 0), (60, 40)])
        ground = pd.DataFrame({"distance_m": [100.0, 0.0, 30.0], "ground_level_m": [10.0, 0.0, 6.0]})
        (given,) = geopackage.with_ground(np.array([line]), pd.Series([100.0]), ground)
        xyz = shapely.get_coordinates(given, include_z=True)
        # by hand: 6 at 30 m, then 4 m more over 70 m, of which 30 m to the corner at 60 m
        np.testing.assert_allclose(xyz, [(0, 0, 0), (30, 0, 6), (60, 0, 6 + 4 * 30 / 70), (60, 40, 10)])

    def test_distances_follow_the_length_given_not_the_unit_of_the_coordinates(self) -> None:
        line = shapely.linestrings([(0, 0), (1000, 0)])  # 1000 ft
        ground = pd.DataFrame({"distance_m": [0.0, 152.4, 304.8], "ground_level_m": [1.0, 2.0, 1.0]})
        (given,) = geopackage.with_ground(np.array([line]), pd.Series([304.8]), ground)
        np.testing.assert_allclose(shapely.get_coordinates(given)[:, 0], [0, 500, 1000])

    @pytest.mark.parametrize("levels", [[np.nan, 1.0], [1.0, np.nan], [np.nan, np.nan]])
    def test_without_levels_at_both_ends_it_has_no_z(self, levels: list[float]) -> None:
        line = shapely.linestrings([(0, 0, 5), (100, 0, 5)])  # Z of unknown meaning goes
        ground = pd.DataFrame({"distance_m": [0.0, 100.0], "ground_level_m": levels})
        (given,) = geopackage.with_ground(np.array([line]), pd.Series([100.0]), ground)
        assert not shapely.has_z(given)

    def test_without_a_ground_table_the_file_is_valid_and_flat(self, results: Results, tmp_path: Path) -> None:
        tables = {name: table for name, table in results.tables.items() if name != "ground"}
        (path,) = geopackage.write(dataclasses.replace(results, tables=tables), tmp_path)
        assert complaints(path) == []
        assert not gpd.read_file(path, layer="alignment").has_z.any()


class TestSchema:
    """Every column says what it is and what it may hold."""

    def test_every_column_of_every_layer_has_a_title_and_a_meaning(self, connection: sqlite3.Connection) -> None:
        described = {
            (table, column): (title, meaning)
            for table, column, title, meaning in connection.execute(
                "select table_name, column_name, title, description from gpkg_data_columns"
            )
        }
        for layer in schema.layers():
            columns = [row[1] for row in connection.execute(f"pragma table_info({layer})")]
            assert columns[0] == "fid"
            for name in columns:
                title, meaning = described.pop((layer, name))
                assert title
                assert meaning
                if name not in ("fid", "geom"):
                    assert (title, meaning) == (schema.column(name).title, schema.column(name).meaning)
        assert not described

    def test_choices_and_ranges_are_those_of_the_vocabulary(self, connection: sqlite3.Connection) -> None:
        rows = connection.execute(
            "select d.column_name, c.constraint_type, c.value, c.min, c.max from gpkg_data_columns d "
            "join gpkg_data_column_constraints c using (constraint_name)"
        ).fetchall()
        for column in {row[0] for row in rows} - {"soil_group", "uscs_symbol", "aashto_group", "usda_texture"}:
            known = schema.column(column)
            of = [row[1:] for row in rows if row[0] == column]
            if known.choices:
                assert {(kind, value) for kind, value, _, _ in of} == {("enum", word) for word in known.choices}
            else:
                low = -np.inf if known.minimum is None else known.minimum
                high = np.inf if known.maximum is None else known.maximum
                assert set(of) == {("range", None, low, high)}
        limited = {c for c in schema.columns().values() if c.choices or c.minimum is not None or c.maximum is not None}
        layered = {name for layout in schema.layers().values() for name in layout.columns}
        assert {c.name for c in limited} & layered <= {row[0] for row in rows}

    def test_soil_symbols_are_choices_with_their_names(self, connection: sqlite3.Connection) -> None:
        query = "select value, description from gpkg_data_column_constraints where constraint_name = ?"
        choices = dict(connection.execute(query, ("soil_group_choices",)))
        assert choices["PT"] == "peat"
        assert choices["n/d"] == "not determined"

    def test_no_value_breaks_its_constraint(self, connection: sqlite3.Connection) -> None:
        constrained = connection.execute(
            "select distinct table_name, column_name, constraint_name, constraint_type from gpkg_data_columns "
            "join gpkg_data_column_constraints using (constraint_name)"
        ).fetchall()
        assert len(constrained) > 50
        for table, column, constraint, kind in constrained:
            test = (
                "v not in (select value from gpkg_data_column_constraints where constraint_name = ?)"
                if kind == "enum"
                else "not exists (select 1 from gpkg_data_column_constraints where constraint_name = ? "
                "and v between min and max)"
            )
            query = f'select v from (select "{column}" v from {table}) where v is not null and {test}'  # noqa: S608
            assert connection.execute(query, (constraint,)).fetchall() == [], (table, column)

    def test_a_symbol_that_the_legend_lacks_is_let_in(self, results: Results, tmp_path: Path) -> None:
        subgrade = results.tables["subgrade"].assign(soil_group="ZZ")
        (path,) = geopackage.write(changed(results, subgrade=subgrade), tmp_path)
        with closing(sqlite3.connect(path)) as opened:
            found = opened.execute("select 1 from gpkg_data_column_constraints where value = 'ZZ'").fetchall()
        assert found == [(1,)]


class TestProvenance:
    """The file says where it comes from."""

    def test_run_and_cautions_are_metadata_of_the_whole_file(
        self, connection: sqlite3.Connection, results: Results
    ) -> None:
        rows = connection.execute(
            "select mime_type, metadata, reference_scope from gpkg_metadata m "
            "join gpkg_metadata_reference r on m.id = r.md_file_id order by m.id"
        ).fetchall()
        assert [(mime, scope) for mime, _, scope in rows] == [
            ("application/json", "geopackage"),
            ("text/plain", "geopackage"),
        ]
        said = json.loads(rows[0][1])
        assert said["cautions"] == list(results.cautions)
        assert said["issue"] == results.issue
        assert said["run"]["seed"] == "1"
        assert said["counts"][0] == {"table": "borings", "read": 4, "used": 3, "left_out": 1}
        assert all(caution in rows[1][1] for caution in results.cautions)

    def test_the_date_is_that_of_the_run_if_it_has_one(self, results: Results, tmp_path: Path) -> None:
        run = pd.concat(
            [results.tables["run"], pd.DataFrame({"key": ["written"], "value": ["2024-05-06T09:08:07+02:00"]})],
            ignore_index=True,
        )
        (path,) = geopackage.write(changed(results, run=run), tmp_path)
        assert complaints(path) == []
        with closing(sqlite3.connect(path)) as opened:
            dates = opened.execute("select distinct last_change from gpkg_contents").fetchall()
        assert dates == [("2024-05-06T07:08:07.000Z",)]

    def test_without_one_or_with_nonsense_it_is_fixed(self, results: Results) -> None:
        nonsense = pd.DataFrame({"key": ["written"], "value": ["a while ago"]})
        assert geopackage.change_date(results) == geopackage.FIXED_DATE
        assert geopackage.change_date(changed(results, run=nonsense)) == geopackage.FIXED_DATE


def test_the_same_results_give_the_same_bytes(path: Path, results: Results, tmp_path: Path) -> None:
    (again,) = geopackage.write(results, tmp_path)
    assert again.read_bytes() == path.read_bytes()


def test_the_date_setting_of_the_process_is_put_back(results: Results, tmp_path: Path) -> None:
    before = pyogrio.get_gdal_config_option("OGR_CURRENT_DATE")
    geopackage.write(results, tmp_path)
    assert pyogrio.get_gdal_config_option("OGR_CURRENT_DATE") == before


def test_results_are_not_touched(tmp_path: Path) -> None:
    results = sample_results()
    before = {name: table.copy() for name, table in results.tables.items()}
    geopackage.write(results, tmp_path)
    for name, table in before.items():
        pd.testing.assert_frame_equal(results.tables[name], table)


def test_infinite_numbers_and_nul_do_not_reach_the_file(results: Results, tmp_path: Path) -> None:
    borings = results.tables["borings"].copy()
    borings["depth_m"] = [np.inf, -np.inf, np.nan, 3.0]
    borings["remarks"] = pd.array(["before\x00after", None, "a\nb", "é"], dtype="string")
    (path,) = geopackage.write(changed(results, borings=borings), tmp_path)
    back = gpd.read_file(path, layer="borings")
    assert back["depth_m"].isna().tolist() == [True, True, True, False]
    assert back["remarks"].tolist()[0] == "beforeafter"
    assert back["remarks"].tolist()[2:] == ["a\nb", "é"]


def test_a_corridor_without_findings_or_formation_still_has_every_layer(results: Results, tmp_path: Path) -> None:
    tables = {name: table for name, table in results.tables.items() if name != "subgrade"}
    tables["findings"] = tables["findings"].iloc[:0]
    tables["samples"] = tables["samples"].iloc[:0]
    (path,) = geopackage.write(dataclasses.replace(results, tables=tables), tmp_path)
    assert complaints(path) == []
    assert [name for name, _ in pyogrio.list_layers(path)] == [*schema.layers(), "layer_styles"]
    assert len(gpd.read_file(path, layer="subgrade")) == 0


def test_samples_without_a_place_are_kept(results: Results, tmp_path: Path) -> None:
    samples = results.tables["samples"].copy()
    samples["geometry"] = [None, *list(samples["geometry"])[1:]]
    (path,) = geopackage.write(changed(results, samples=samples), tmp_path)
    assert gpd.read_file(path, layer="samples").geometry.isna().sum() == 1


@pytest.mark.parametrize("name", HOSTILE)
def test_hostile_names_stay_text(name: str, tmp_path: Path) -> None:
    folder = tmp_path / "inside"
    folder.mkdir()
    (path,) = geopackage.write(sample_results(name=name, first=name), folder)
    assert path.parent == folder
    assert [p.name for p in tmp_path.iterdir()] == ["inside"]
    assert complaints(path) == []
    assert gpd.read_file(path, layer="borings")["boring"].iloc[0] == name
    assert gpd.read_file(path, layer="alignment")["name"].iloc[0] == name


class TestPublishing:
    """A file that a GIS has open is never harmed."""

    @pytest.mark.parametrize("journal", ["delete", "wal"])
    def test_a_held_file_stays_as_it_was(self, results: Results, tmp_path: Path, journal: str) -> None:
        def run(issue: str) -> None:
            with publish.staging(tmp_path) as stage:
                publish.publish(geopackage.write(dataclasses.replace(results, issue=issue), stage), tmp_path)

        def issue() -> str:
            with closing(sqlite3.connect(tmp_path / "otter_brook_bypass.gpkg")) as opened:
                return str(json.loads(opened.execute("select metadata from gpkg_metadata").fetchone()[0])["issue"])

        run("first")
        holder = sqlite3.connect(tmp_path / "otter_brook_bypass.gpkg", isolation_level=None)
        holder.execute(f"pragma journal_mode = {journal}")
        holder.execute("begin exclusive" if journal == "delete" else "begin")
        holder.execute("select * from borings").fetchall()
        with pytest.raises(OutputInUseError):
            run("second")
        holder.close()
        assert issue() == "first"
        run("third")
        assert issue() == "third"
        assert [p.name for p in tmp_path.iterdir()] == ["otter_brook_bypass.gpkg"]

    @pytest.mark.parametrize("limit", [4_000, 150_000, 500_000])
    def test_a_disk_that_fills_up_is_an_output_error_and_leaves_nothing(self, tmp_path: Path, limit: int) -> None:
        pytest.importorskip("resource")
        script = (
            "import resource, signal, sys; from pathlib import Path\n"
            "from geomap.errors import OutputInUseError; from geomap.exports import geopackage, publish\n"
            "from tests.unit.exports.sample import sample_results\n"
            "results = sample_results(); signal.signal(signal.SIGXFSZ, signal.SIG_IGN)\n"
            "resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[2]),) * 2)\n"
            "try:\n"
            "    with publish.staging(Path(sys.argv[1])) as stage: geopackage.write(results, stage)\n"
            "except OutputInUseError as error: print('said:', error)"
        )
        environment = {**os.environ, "PYTHONPATH": os.pathsep.join([str(Path.cwd()), *sys.path])}
        command = [sys.executable, "-c", script, str(tmp_path / "out"), str(limit)]
        done = subprocess.run(command, capture_output=True, text=True, env=environment, check=True)
        assert "said:" in done.stdout
        assert list(tmp_path.iterdir()) == []
