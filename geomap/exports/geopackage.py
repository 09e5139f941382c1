"""The layers as one OGC GeoPackage, version 1.3, for any GIS.

Version 1.3 rather than 1.4, because programs a few years old open it without a warning. The order of the work
matters: first the layers, by GDAL; then, with that file closed, descriptions, metadata and styles as plain
SQL tables. The same results give the same bytes. Clause numbers of the standard are from memory; the validator in
the tests judges the substance.

Days stay text, ``year-month-day``. A DATE column of a GeoPackage holds the very same text; GDAL would declare
one only through Arrow, which is an optional package, and the type of a column must not hang on that.
"""

from __future__ import annotations

import contextlib
import sqlite3
import warnings
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

import geopandas as gpd
import numpy as np
import pandas as pd
import pyogrio
import shapely
from pyogrio.errors import DataLayerError, DataSourceError, FeatureError

from geomap.errors import OutputInUseError
from geomap.exports import geopackage_metadata, geopackage_schema, geopackage_styles
from geomap.exports.texts import file_stem, stored_text
from geomap.results import Results
from geomap.tables import schema
from geomap.tables.schema import Layout

NAME = "geopackage"
TITLE = "GeoPackage with a layer for each table, described and styled"

VERSION = "1.3"
UNDEFINED_CARTESIAN = -1  # srs_id; OGC 12-128r17, clause 1.1.2.1.2
FIXED_DATE = "2000-01-01T00:00:00.000Z"  # stands for "not recorded": a clock would change the bytes
SECTION_LAYERS = frozenset({"profile_cells"})  # drawn in the plane of distance and level, not on a map
_NEARER_M = 0.001  # vertices closer than this are one


def write(results: Results, folder: Path) -> list[Path]:
    """Write the GeoPackage into `folder` and return its path.

    Parameters
    ----------
    results
        The answer for one corridor; a layer that is missing from its tables is written without rows.
    folder
        An empty folder such as `publish.staging` gives. Never the target: GDAL deletes a file that it cannot open.

    Raises
    ------
    OutputInUseError
        The disk does not take the file.
    """
    path = folder / f"{file_stem(results.name)}.gpkg"
    frames = {name: layer_frame(results, layout) for name, layout in schema.layers().items()}
    date = change_date(results)
    try:
        with _dated(date):
            for name, frame in frames.items():
                _write_layer(path, name, frame)
    except (DataLayerError, DataSourceError, FeatureError) as cause:
        raise OutputInUseError(f"{path.name}: cannot be written ({cause}); the old outputs are as they were") from cause
    with contextlib.closing(sqlite3.connect(path, isolation_level=None)) as connection:
        connection.execute("begin")
        geopackage_schema.describe(connection, results, frames)
        geopackage_metadata.add(connection, results, date)
        geopackage_styles.add(connection, results, frames, date)
        connection.execute("commit")
        _verify(connection, path, frames)
    return [path]


def layer_frame(results: Results, layout: Layout) -> pd.DataFrame:
    """Return one layer as it is written: the layout's columns, finite numbers, text that a database takes.

    A GeoDataFrame where the layout has a geometry. A profile section has no coordinate reference system.
    """
    table = results.tables.get(layout.name, pd.DataFrame())
    frame = schema.conform(table, layout).reset_index(drop=True)
    for name in frame.columns.drop("geometry", errors="ignore"):
        if pd.api.types.is_float_dtype(frame[name].dtype):
            frame[name] = frame[name].where(np.isfinite(frame[name]))
        elif pd.api.types.is_string_dtype(frame[name].dtype):
            frame[name] = frame[name].map(stored_text, na_action="ignore").astype("string")
    if layout.geometry is None:
        return frame
    shapes = np.asarray(frame["geometry"], dtype=object) if "geometry" in frame else np.empty(0, dtype=object)
    if layout.name == "alignment" and len(frame):
        shapes = with_ground(shapes, frame["length_m"], results.tables.get("ground", pd.DataFrame()))
    crs = None if layout.name in SECTION_LAYERS else results.crs
    placed: pd.DataFrame = gpd.GeoDataFrame(
        frame.drop(columns="geometry", errors="ignore"), geometry=gpd.GeoSeries(shapes, crs=crs)
    )
    return placed


def with_ground(lines: np.ndarray, length_m: pd.Series, ground: pd.DataFrame) -> np.ndarray:
    """Return the lines with the ground level [m] as Z, or without Z where it is not known from end to end.

    A vertex is added at each distance of the ground table; the course of the line in plan does not change.

    Parameters
    ----------
    lines
        Line geometries, from distance 0 to `length_m`. Their own length may be in another unit or at grid scale.
    length_m
        Length along each line [m].
    ground
        Table with ``distance_m`` and ``ground_level_m``, in any order; rows without a level are passed over.
    """
    known = ground.dropna(subset=["distance_m", "ground_level_m"]) if len(ground) else ground
    known = known.sort_values("distance_m") if len(known) else known
    return np.array([_with_ground(*pair, known) for pair in zip(lines, length_m, strict=True)], dtype=object)


def _with_ground(line: Any, length_m: float, known: pd.DataFrame) -> Any:
    plan = shapely.force_2d(line)
    if not len(known) or line is None or not length_m > 0:
        return plan
    at = known["distance_m"].to_numpy(float)
    # Levels stand at the centers of steps: half a step is left at each end, and the nearest level holds there.
    reach = max(_NEARER_M, float(np.diff(at).max(initial=0.0)))
    if at[0] > reach or at[-1] < length_m - reach:
        return plan
    points = shapely.get_coordinates(plan)
    along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
    along *= length_m / along[-1]
    added = at[(at > _NEARER_M) & (at < length_m - _NEARER_M)]
    gap = np.abs(added[:, None] - along[np.searchsorted(along, added)[:, None] - [1, 0]]).min(axis=1)
    distance = np.sort(np.concatenate([along, added[gap > _NEARER_M]]))
    levels = known["ground_level_m"].to_numpy(float)
    axes = [np.interp(distance, along, points[:, axis]) for axis in (0, 1)]
    return shapely.linestrings(np.column_stack([*axes, np.interp(distance, at, levels)]))


def change_date(results: Results) -> str:
    """Return the date for ``last_change``: that of the run if its table has one as ``written``, else a fixed one."""
    written = pd.to_datetime(results.run_value("written") or "none", utc=True, errors="coerce")
    return FIXED_DATE if pd.isna(written) else str(written.strftime("%Y-%m-%dT%H:%M:%S.000Z"))


def _write_layer(path: Path, name: str, frame: pd.DataFrame) -> None:
    layout = schema.layers()[name]
    options: dict[str, Any] = {"IDENTIFIER": layout.title, "DESCRIPTION": layout.meaning}
    shape = layout.geometry
    if isinstance(frame, gpd.GeoDataFrame):
        shape = f"{shape} Z" if frame.has_z.any() else shape
        options |= {"SRID": UNDEFINED_CARTESIAN} if frame.crs is None else {}
    creation = {} if path.exists() else {"VERSION": VERSION}
    with warnings.catch_warnings():  # a section has no coordinate reference system, on purpose
        warnings.filterwarnings("ignore", message="'crs' was not provided", category=UserWarning)
        pyogrio.write_dataframe(
            frame,
            path,
            layer=name,
            driver="GPKG",
            geometry_type=shape,
            dataset_options=creation,
            layer_options=options,
            use_arrow=False,
        )


@contextlib.contextmanager
def _dated(date: str) -> Iterator[None]:
    """Make GDAL write one date instead of the time of day."""
    before = pyogrio.get_gdal_config_option("OGR_CURRENT_DATE")
    pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": date})
    try:
        yield
    finally:
        pyogrio.set_gdal_config_options({"OGR_CURRENT_DATE": before})


def _verify(connection: sqlite3.Connection, path: Path, frames: Mapping[str, pd.DataFrame]) -> None:
    """Raise unless every row arrived: a disk that fills up is not always reported by the writer."""
    for name, frame in frames.items():
        (rows,) = connection.execute(f'select count(*) from "{name}"').fetchone()  # noqa: S608 - names are the schema's
        if rows != len(frame):
            raise OutputInUseError(f"{path.name}: layer {name} took {rows} of {len(frame)} rows; is the disk full?")
    if connection.execute("pragma quick_check").fetchall() != [("ok",)]:
        raise OutputInUseError(f"{path.name}: the file did not arrive whole on the disk; is it full?")
