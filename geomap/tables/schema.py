"""The vocabulary as objects: columns and layouts, and frames made to fit them.

`columns.toml` and `layouts.toml` are the only places where a column or a table is described; readers, intake,
exports and the documentation are made from them.
"""

from __future__ import annotations

import functools
import re
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from importlib import resources
from types import MappingProxyType
from typing import Any

import pandas as pd

SOURCE_COLUMNS = ("file", "sheet", "row_number")

_DTYPES = {"text": "string", "number": "float64", "integer": "Int64", "date": "string", "flag": "boolean"}
_PASSING = re.compile(r"passing_(\d+(?:_\d+)?)_mm_pct")


@dataclass(frozen=True)
class Column:
    """One column: what its values are and which headings mean it."""

    name: str
    type: str
    title: str
    meaning: str
    unit: str = ""
    minimum: float | None = None
    maximum: float | None = None
    choices: tuple[str, ...] = ()
    aliases: tuple[str, ...] = ()
    nonplastic: bool = False
    censored: bool = False

    @property
    def dtype(self) -> str:
        """The pandas dtype of the column inside geomap."""
        return _DTYPES[self.type]

    @property
    def allowed(self) -> str:
        """What may stand in the column, in words for a message."""
        if self.choices:
            return ", ".join(self.choices)
        words = {"text": "text", "number": "a number", "integer": "a whole number", "flag": "yes or no"}
        text = words.get(self.type, "a date as year-month-day")
        if self.minimum is not None and self.maximum is not None:
            text = f"{self.minimum:g} to {self.maximum:g}"
        elif self.minimum is not None:
            text += f", {self.minimum:g} or more"
        return text + (", or NP" if self.nonplastic else "") + (", also as <2 or >100" if self.censored else "")


@dataclass(frozen=True)
class Layout:
    """One table: its columns in order, its key, and what an input file must have."""

    name: str
    title: str
    meaning: str
    columns: tuple[str, ...]
    key: tuple[str, ...] = ()
    required: tuple[str, ...] = ()
    geometry: str | None = None
    takes_passing: bool = False


def _toml(name: str) -> dict[str, Any]:
    return tomllib.loads((resources.files("geomap.tables") / name).read_text("utf-8"))


@functools.cache
def columns() -> Mapping[str, Column]:
    """Return every column of `columns.toml` by name."""
    return MappingProxyType({name: _column(name, entry) for name, entry in _toml("columns.toml").items()})


def _column(name: str, entry: Mapping[str, Any]) -> Column:
    values: dict[str, Any] = {key: tuple(v) if isinstance(v, list) else v for key, v in entry.items()}
    return Column(name=name, **values)


def _layout(name: str, entry: Mapping[str, Any]) -> Layout:
    return Layout(
        name=name,
        title=entry["title"],
        meaning=entry["meaning"],
        columns=tuple(
            entry["columns"] if "columns" in entry else _toml("layouts.toml")[entry["columns_of"]]["columns"]
        ),
        key=tuple(entry.get("key", ())),
        required=tuple(entry.get("required", ())),
        geometry=entry.get("geometry"),
        takes_passing=entry.get("family") == "passing",
    )


@functools.cache
def inputs() -> Mapping[str, Layout]:
    """Return the layouts of input tables by name."""
    return MappingProxyType({n: _layout(n, e) for n, e in _toml("layouts.toml").items() if n != "layers"})


@functools.cache
def layers() -> Mapping[str, Layout]:
    """Return the layouts of output layers by name, in the order in which they are written."""
    return MappingProxyType({n: _layout(n, e) for n, e in _toml("layouts.toml")["layers"].items()})


def passing_column(size_mm: float) -> str:
    """Return the name of the column for percent passing a size.

    Examples
    --------
    >>> passing_column(4.75), passing_column(0.075), passing_column(75.0)
    ('passing_4_75_mm_pct', 'passing_0_075_mm_pct', 'passing_75_mm_pct')
    """
    return f"passing_{size_mm:.6g}".replace(".", "_") + "_mm_pct"


def size_from_passing_column(name: str) -> float | None:
    """Return the size in millimeters of a passing column, or None for any other column.

    Examples
    --------
    >>> size_from_passing_column("passing_0_075_mm_pct")
    0.075
    >>> size_from_passing_column("liquid_limit_pct") is None
    True
    """
    match = _PASSING.fullmatch(name)
    return float(match.group(1).replace("_", ".")) if match else None


def column(name: str) -> Column:
    """Return the column called `name`; the passing family and the bounds of censored columns included.

    A column declared ``censored`` may have a companion ``<name>_bound`` that holds ``<`` or ``>``.

    Raises
    ------
    KeyError
        There is no such column.
    """
    if name.endswith("_bound") and columns()[name.removesuffix("_bound")].censored:
        of = columns()[name.removesuffix("_bound")]
        return Column(
            name=name,
            type="text",
            choices=("<", ">"),
            title=f"{of.title}, bound",
            meaning=f"< or > where {of.name} was reported as less or more than the number; blank where it is the value",
        )
    size = size_from_passing_column(name)
    if size is None:
        return columns()[name]
    return Column(
        name=name,
        type="number",
        unit="pct",
        minimum=0.0,
        maximum=100.0,
        title=f"Passing {size:g} mm (%)",
        meaning=f"Percent by dry mass finer than {size:g} mm",
    )


def passing_columns(names: Iterable[str]) -> list[str]:
    """Return those of `names` that belong to the passing family, coarsest first."""
    sizes = [(size, name) for name in names if (size := size_from_passing_column(name)) is not None]
    return [name for _, name in sorted(sizes, reverse=True)]


def conform(frame: pd.DataFrame, layout: Layout, extra: Iterable[str] = ()) -> pd.DataFrame:
    """Return a copy of `frame` with exactly the layout's columns, in its order, with the declared types.

    Columns that are missing are added as missing values. For a layout that takes the passing family, its
    members come before the D sizes. A bound follows its column. A ``geometry`` column is kept as it is.

    Parameters
    ----------
    frame
        Any table; its index is kept.
    layout
        The layout to fit.
    extra
        Further columns to keep, after the layout's own.
    """
    names = [*layout.columns, *(n for n in extra if n not in layout.columns)]
    names = [n for name in names for n in (name, f"{name}_bound") if n == name or n in frame.columns]
    if layout.takes_passing:
        at = names.index("d10_mm") if "d10_mm" in names else len(names)
        names[at:at] = passing_columns(frame.columns)
    fitted = {
        name: frame[name].astype(column(name).dtype)  # type: ignore[call-overload]
        if name in frame.columns
        else pd.Series(pd.NA if column(name).dtype != "float64" else float("nan"), frame.index, column(name).dtype)
        for name in names
    }
    result = pd.DataFrame(fitted, index=frame.index)
    if "geometry" in frame.columns:
        result["geometry"] = frame["geometry"]
    return result
