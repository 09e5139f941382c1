"""One table to one file, by its ending: CSV, XLSX, Parquet or GeoPackage."""

from __future__ import annotations

import os
import tempfile
from collections.abc import Callable, Mapping
from pathlib import Path

import pandas as pd

from geomap.errors import InputError, OutputInUseError, UsageError, problem
from geomap.exports.texts import spreadsheet_cell


def save(table: pd.DataFrame, path: Path) -> None:
    """Write `table` to `path`; an old file there stays until the new one is complete.

    Cells that a spreadsheet would read as a formula are marked as text in CSV and XLSX.

    Raises
    ------
    UsageError
        The ending is not one of those known.
    OutputInUseError
        The file cannot be written.
    InputError
        Parquet is asked for and pyarrow is not installed.
    """
    check_ending(path)
    handle = None
    try:
        handle, name = tempfile.mkstemp(suffix=path.suffix, prefix=".geomap-", dir=path.parent or None)
        os.close(handle)
        _WRITERS[path.suffix.lower()](table, Path(name))
        Path(name).replace(path)
    except ImportError:
        Path(name).unlink(missing_ok=True)
        remedy = "install it with: pip install 'geomap[arrow]', or choose another ending"
        raise InputError(problem(str(path), "Parquet without pyarrow", "Parquet with pyarrow", remedy)) from None
    except OSError as error:
        if handle is not None:
            Path(name).unlink(missing_ok=True)
        allowed = "a file that can be written"
        raise OutputInUseError(
            problem(str(path), error.strerror or error, allowed, "close it or name another")
        ) from None


def check_ending(path: Path) -> None:
    """Raise a UsageError where `path` has no ending that :func:`save` knows."""
    if path.suffix.lower() not in _WRITERS:
        raise UsageError(problem(str(path), path.suffix or "no ending", ", ".join(_WRITERS), "choose one of these"))


def _guarded(table: pd.DataFrame) -> pd.DataFrame:
    result = table.copy()
    for name in result.columns:
        if not pd.api.types.is_numeric_dtype(result[name]) or result[name].dtype == bool:
            result[name] = result[name].map(lambda v: spreadsheet_cell(v) if isinstance(v, str) else v)
    return result.rename(columns=lambda name: spreadsheet_cell(str(name)))


def _csv(table: pd.DataFrame, path: Path) -> None:
    _guarded(table).to_csv(path, index=False, encoding="utf-8-sig", lineterminator="\r\n")


def _xlsx(table: pd.DataFrame, path: Path) -> None:
    _guarded(table).to_excel(path, index=False, sheet_name="geomap", freeze_panes=(1, 0))


def _parquet(table: pd.DataFrame, path: Path) -> None:
    table.to_parquet(path, index=False)


def _geopackage(table: pd.DataFrame, path: Path) -> None:
    import pyogrio

    path.unlink()
    pyogrio.write_dataframe(table, path, layer="samples", driver="GPKG", dataset_options={"VERSION": "1.3"})


_WRITERS: Mapping[str, Callable[[pd.DataFrame, Path], None]] = {
    ".csv": _csv,
    ".xlsx": _xlsx,
    ".parquet": _parquet,
    ".gpkg": _geopackage,
}
