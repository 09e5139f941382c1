"""Schedules: what a contractor or a checker reads in a spreadsheet, as CSV files in a folder of their own.

The folder has the name of the corridor, ``<corridor>_schedules``, so that several corridors can share one output
folder. In it are:

- ``subgrade.csv``: stretches of the alignment with one answer each, merged from the steps;
- ``borings.csv``, ``samples.csv``, ``findings.csv``: the tables behind it;
- ``about.csv``: issue, cautions, reference systems, counts and the run, a line each.

Headings stand in the first line, so that filters work and programs can read the file; lines of remarks on top
would break both. What every output must say therefore stands at the foot, after an empty line, in one cell that
starts with ``Issue``, and in full in ``about.csv``.

Files are UTF-8 with a byte order mark, which makes spreadsheets read names of any language, and end lines as
RFC 4180 asks. Lengths are in the corridor's unit for people, named in the heading.
"""

from __future__ import annotations

import re
from collections.abc import Iterable
from pathlib import Path

import pandas as pd

from geomap.exports.stretches import stretches
from geomap.exports.texts import file_stem, spreadsheet_cell
from geomap.results import Results
from geomap.tables import schema
from geomap.units import factor_from_spelling

NAME = "schedules"
TITLE = "Schedules of subgrade, borings, samples and findings as CSV"

FOLDER_ENDING = "_schedules"
_METERS = "(m)"
_LENGTH_DECIMALS = 3  # a millimeter, or a thousandth of a foot
_OTHER_DECIMALS = 6  # takes away the tail that binary numbers leave, and no more
_CHAINAGES = ("Chainage", "From chainage", "To chainage")  # headings of labels that geomap writes itself
_NEGATIVE_CHAINAGE = re.compile(r"-\d+\+\d+(?:\.\d+)?")
_MINUS = "\u2212"  # the minus sign proper, which starts no formula

_BORINGS = (
    *("boring", "chainage", "distance_m", "offset_m", "side", "ground_level_m", "depth_m", "date", "method"),
    *("status", "reason", "remarks"),
)
_SAMPLES = (
    *("boring", "sample", "chainage", "offset_m", "top_depth_m", "base_depth_m", "description", "visual_group"),
    *("origin", "unit", "gravel_pct", "sand_pct", "fines_pct", "liquid_limit_pct", "plastic_limit_pct"),
    *("plasticity_index_pct", "moisture_pct", "organic_pct", "cbr_soaked_pct", "cbr_unsoaked_pct"),
    *("cbr_in_place_pct", "spt_n", "uscs_symbol", "uscs_name", "uscs_symbol_reason", "aashto_group", "group_index"),
    *("aashto_group_reason", "usda_texture", "subgrade_rating", "suitability", "suitability_reason", "rule"),
    *("status", "reason", "lab_sheet", "file", "sheet", "row_number"),
)


def write(results: Results, folder: Path) -> list[Path]:
    """Write the schedules into a subfolder of `folder` and return their paths.

    Parameters
    ----------
    results
        The answer for one corridor. Schedules of tables that it lacks have headings and no rows.
    folder
        A staging folder.
    """
    schedules = {
        "subgrade": stretches(_table(results, "subgrade")),
        "borings": _titled(_table(results, "borings"), _BORINGS),
        "samples": _titled(_as_reported(_table(results, "samples")), _SAMPLES),
        "findings": _titled(_table(results, "findings"), schema.layers()["findings"].columns),
    }
    target = folder / (file_stem(results.name) + FOLDER_ENDING)
    target.mkdir(exist_ok=True)
    paths = []
    for name, table in schedules.items():
        text = csv_text(for_people(table, results.length_unit), foot=[foot(results)])
        paths.append(_write(target / f"{name}.csv", text))
    return [*paths, _write(target / "about.csv", csv_text(about(results)))]


def for_people(table: pd.DataFrame, length_unit: str) -> pd.DataFrame:
    """Return a table with lengths in `length_unit`, in the heading too, and without the tails of binary numbers.

    Parameters
    ----------
    table
        Headings for people; one that ends in ``(m)`` is a length in meters.
    length_unit
        ``m``, ``ft`` or ``us-ft``.

    Examples
    --------
    >>> for_people(pd.DataFrame({"Length (m)": [3.048], "P unsuitable": [0.1 + 0.2]}), "ft").to_dict("list")
    {'Length (ft)': [10.0], 'P unsuitable': [0.3]}
    """
    factor = factor_from_spelling("m", length_unit) or 1.0
    shown = {}
    for title in table.columns:
        values = table[title]
        if title.endswith(_METERS):
            values = (values.astype("float64") / factor).round(_LENGTH_DECIMALS)
        elif pd.api.types.is_float_dtype(values.dtype):
            values = values.round(_OTHER_DECIMALS)
        shown[title.replace(_METERS, f"({length_unit})")] = values
    return pd.DataFrame(shown, index=table.index)


def csv_text(table: pd.DataFrame, foot: Iterable[str] = ()) -> str:
    """Return a table as CSV whose texts a spreadsheet shows and does not run; numbers stay numbers.

    Parameters
    ----------
    table
        Any table; its index is left out.
    foot
        Texts for lines after the table, one cell each, an empty line before.
    """
    safe = table.copy()
    for name in table.columns:
        if not pd.api.types.is_numeric_dtype(table[name].dtype):
            shown = _label if name in _CHAINAGES else spreadsheet_cell
            safe[name] = table[name].map(lambda value, shown=shown: shown(str(value)), na_action="ignore")
    body = safe.to_csv(index=False, lineterminator="\r\n")
    lines = pd.DataFrame([spreadsheet_cell(line) for line in foot])
    return body + ("\r\n" + lines.to_csv(index=False, header=False, lineterminator="\r\n") if len(lines) else "")


def _label(text: str) -> str:
    """Return a safe chainage; one before zero has a minus sign proper, for a hyphen would make it a sum.

    A spreadsheet reads -0+500 as a formula and shows 500, the wrong side of the start.

    Examples
    --------
    >>> _label("-0+500") == "\u2212" + "0+500", _label("12+300"), _label("-1+1-1")
    (True, '12+300', "'-1+1-1")
    """
    return _MINUS + text[1:] if _NEGATIVE_CHAINAGE.fullmatch(text) else spreadsheet_cell(text)


def foot(results: Results) -> str:
    """Return what stands under every schedule: the issue and the cautions."""
    return " ".join([f"Issue {results.issue}." if results.issue else "Issue not stated.", *results.cautions])


def about(results: Results) -> pd.DataFrame:
    """Return the sheet that says what the schedules are and where they come from."""
    rows = [
        ("Corridor", results.name),
        ("Use", results.use),
        ("Issue", results.issue),
        *(("Caution", caution) for caution in results.cautions),
        ("Coordinate reference system", results.crs),
        ("Vertical datum", results.vertical_datum),
        ("Unit of lengths", results.length_unit),
        ("subgrade.csv", "Stretches with one answer each; a chainage equation starts a new stretch"),
        (
            "subgrade.csv",
            "Probabilities are the lowest and highest of the steps in the stretch; P unsuitable is the highest",
        ),
    ]
    counts = results.tables.get("counts", pd.DataFrame(columns=["table", "read", "used", "left_out"]))
    for table, read, used, left_out in counts[["table", "read", "used", "left_out"]].itertuples(index=False):
        rows.append((f"Count of {table}", f"{read} read, {used} used, {left_out} left out"))
    rows += list(_table(results, "run")[["key", "value"]].itertuples(index=False, name=None))
    return pd.DataFrame(rows, columns=["Item", "Text"]).astype("string")


def _as_reported(samples: pd.DataFrame) -> pd.DataFrame:
    """Return samples with NP and with < and > written as a lab sheet writes them."""
    shown = samples.copy()
    nonplastic = samples["is_nonplastic"].fillna(value=False).astype(bool)
    for column in (schema.column(name) for name in schema.layers()["samples"].columns):
        values = samples[column.name]
        if column.nonplastic:
            shown[column.name] = values.astype("object").mask(nonplastic & values.isna(), "NP")
        if f"{column.name}_bound" in samples.columns:
            bounds = samples[f"{column.name}_bound"].where(values.notna())
            signed = bounds.astype("object") + values.map("{:g}".format, na_action="ignore").astype("object")
            shown[column.name] = values.astype("object").mask(bounds.notna(), signed)
    return shown


def _table(results: Results, name: str) -> pd.DataFrame:
    return schema.conform(results.tables.get(name, pd.DataFrame()), schema.layers()[name])


def _titled(table: pd.DataFrame, columns: Iterable[str]) -> pd.DataFrame:
    """Return those columns, in that order, under their titles."""
    return pd.DataFrame({schema.column(name).title: table[name] for name in columns}, index=table.index)


def _write(path: Path, text: str) -> Path:
    path.write_bytes(text.encode("utf-8-sig"))
    return path
