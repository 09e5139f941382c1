"""One table to one file, by its ending: CSV, XLSX, Parquet or GeoPackage."""

from __future__ import annotations

import itertools
import re
from collections.abc import Callable, Iterable, Mapping, Sequence
from pathlib import Path

import pandas as pd

from geomap.errors import InputError, OutputInUseError, UsageError, problem
from geomap.exports.publish import publish, staging
from geomap.exports.texts import spreadsheet_cell, stored_text

# most that a sheet holds, as the makers of spreadsheets publish it; from memory
MOST_XLSX_ROWS = 1_048_575  # below the headings
MOST_XLSX_COLUMNS = 16_384
MOST_XLSX_CHARACTERS = 32_767  # of a cell, counted in UTF-16
TAKEN_IN_GEOPACKAGE = ("fid", "geom")  # what GDAL calls the key and the geometry
_NO_XML = re.compile("[\ufffe\uffff]")  # XML 1.0, clause 2.2: no characters
_SMALLER = "choose CSV, Parquet or GeoPackage"


def save(table: pd.DataFrame, path: Path, name: str) -> dict[str, str]:
    """Write `table` to `path`; an old file there stays until the new one is complete, and so do its permissions.

    Cells that a spreadsheet would read as a formula are marked as text in CSV and XLSX.

    Parameters
    ----------
    table
        Its headings may be alike; its index is not written.
    path
        File; the ending decides the format.
    name
        Name of the sheet or layer, in formats that have one.

    Returns
    -------
    The headings that the format cannot take, each with the one that was written for it.

    Raises
    ------
    UsageError
        The ending is not one of those known.
    OutputInUseError
        The file cannot be written.
    InputError
        The format cannot hold the table, or Parquet is asked for and pyarrow is not installed.
    """
    check_ending(path)
    if not path.parent.is_dir():
        raise OutputInUseError(problem(str(path), "no such folder", "a folder that exists", "make it or name another"))
    headings, naming = [str(c) for c in table.columns], _NAMING.get(path.suffix.lower())
    written = free_names(headings, naming[0], fold=naming[1]) if naming else headings
    try:
        with staging(path.parent) as folder:
            new = folder / path.name
            _WRITERS[path.suffix.lower()](table.set_axis(written, axis="columns"), new, name)
            if path.exists():
                new.chmod(path.stat().st_mode & 0o7777)
            publish([new], path.parent)
    except ImportError:
        remedy = "install it with: pip install 'pyarrow', or choose another ending"
        raise InputError(problem(str(path), "Parquet without pyarrow", "Parquet with pyarrow", remedy)) from None
    except OSError as error:
        cause = error.__cause__ if isinstance(error, OutputInUseError) else error
        if not isinstance(cause, OSError):  # it has its words
            raise
        found, allowed = cause.strerror or cause, "a file that can be written"
        raise OutputInUseError(problem(str(path), found, allowed, "close it or name another")) from error
    return {old: new for old, new in zip(headings, written, strict=True) if old != new}


def check_ending(path: Path) -> None:
    """Raise a UsageError where `path` has no ending that :func:`save` knows."""
    if path.suffix.lower() not in _WRITERS:
        raise UsageError(problem(str(path), path.suffix or "no ending", ", ".join(_WRITERS), "choose one of these"))


def free_names(
    wanted: Sequence[str], taken: Iterable[str], ending: str = "", fold: Callable[[str], str] = str.casefold
) -> list[str]:
    """Return one name for each one wanted, none alike and none taken, whatever the case of the letters.

    A name that is free stays as it is. Another gets `ending`, if there is one, then a number. Names are alike where
    `fold` makes the same of them.

    Examples
    --------
    >>> free_names(["a", "A", "fid", "A_2"], ["fid"])
    ['a', 'A_3', 'fid_2', 'A_2']
    >>> free_names(["uscs_symbol"], ["USCS_symbol", "uscs_symbol_geomap"], "_geomap")
    ['uscs_symbol_geomap_2']
    """
    used = {fold(name) for name in taken}
    result = [""] * len(wanted)
    for place, name in enumerate(wanted):  # those that are free come first: no other may take their names
        if name.strip() and fold(name) not in used:
            used.add(fold(name))
            result[place] = name
    for place, name in enumerate(wanted):
        if not result[place]:
            stem = f"{name if name.strip() else 'column'}{ending}"
            tries = itertools.chain([stem], (f"{stem}_{number}" for number in itertools.count(2)))
            result[place] = next(text for text in tries if fold(text) not in used)
            used.add(fold(result[place]))
    return result


def _texts_made(table: pd.DataFrame, safe: Callable[[str], str]) -> pd.DataFrame:
    """Return the table with every text, headings too, made safe."""
    made = [
        column
        if pd.api.types.is_numeric_dtype(column) and column.dtype != bool
        else column.map(lambda value: safe(value) if isinstance(value, str) else value)
        for _, column in table.items()
    ]
    whole = pd.concat(made, axis="columns") if made else table
    return whole.set_axis([safe(str(heading)) for heading in table.columns], axis="columns")


def _csv(table: pd.DataFrame, path: Path, _: str) -> None:
    _texts_made(table, spreadsheet_cell).to_csv(path, index=False, encoding="utf-8-sig", lineterminator="\r\n")


def _xlsx(table: pd.DataFrame, path: Path, name: str) -> None:
    for count, most, what in (
        (len(table), MOST_XLSX_ROWS, "rows"),
        (len(table.columns), MOST_XLSX_COLUMNS, "columns"),
    ):
        if count > most:
            raise InputError(problem(str(path), f"{count:,} {what}", f"at most {most:,} {what} in XLSX", _SMALLER))
    shown = _texts_made(table, lambda text: _NO_XML.sub("\ufffd", spreadsheet_cell(text)))
    for heading, (_, column) in zip(shown.columns, shown.items(), strict=True):
        _check_lengths(path, heading, [heading, *(cell for cell in column if isinstance(cell, str))])
    shown.to_excel(path, index=False, sheet_name=name, freeze_panes=(1, 0))


def _check_lengths(path: Path, heading: str, cells: Iterable[str]) -> None:
    longest = max(len(cell.encode("utf-16-le", "surrogatepass")) // 2 for cell in cells)
    if longest > MOST_XLSX_CHARACTERS:
        place = f"{path}, {heading if len(heading) < 80 else heading[:77] + '...'}"
        allowed = f"at most {MOST_XLSX_CHARACTERS:,} characters in a cell of XLSX"
        raise InputError(problem(place, f"a cell of {longest:,} characters", allowed, _SMALLER))


def _parquet(table: pd.DataFrame, path: Path, _: str) -> None:
    import pyarrow as pa

    try:
        _texts_made(table, stored_text).to_parquet(path, index=False)
    except pa.ArrowException as error:
        raise InputError(problem(str(path), error, "a table that Parquet can hold", "choose another ending")) from error


def _geopackage(table: pd.DataFrame, path: Path, name: str) -> None:
    import pyogrio
    from pyogrio.errors import DataLayerError, DataSourceError, FeatureError, FieldError

    made = _texts_made(table, stored_text)
    try:
        pyogrio.write_dataframe(made, path, layer=name, driver="GPKG", dataset_options={"VERSION": "1.3"})
    except FieldError as error:
        allowed = "a table that a GeoPackage can hold"
        raise InputError(problem(str(path), error, allowed, "choose another ending")) from error
    except (DataLayerError, DataSourceError, FeatureError) as error:
        allowed = "a file that can be written"
        raise OutputInUseError(problem(str(path), error, allowed, "free the disk or name another")) from error


_WRITERS: Mapping[str, Callable[[pd.DataFrame, Path, str], None]] = {
    ".csv": _csv,
    ".xlsx": _xlsx,
    ".parquet": _parquet,
    ".gpkg": _geopackage,
}
# formats where no two columns may have one name: the names that they keep for themselves, and what makes two alike
_NAMING: Mapping[str, tuple[Sequence[str], Callable[[str], str]]] = {
    ".parquet": ((), str),
    ".gpkg": (TAKEN_IN_GEOPACKAGE, str.casefold),
}
