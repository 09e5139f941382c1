"""What one entry of a text, choice, flag or date column says.

Like numbers, entries are judged once for each different text.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

import numpy as np
import pandas as pd

from geomap.intake.damage import is_damaged_name
from geomap.intake.numbers import MARKS_FOR_BLANK, SPREADSHEET_ERRORS, clean, is_nonplastic
from geomap.tables.findings import Check
from geomap.tables.schema import Column

NAME_COLUMNS = ("boring", "sample")
FREE_COLUMNS = ("description", "remarks", "chainage")  # kept word for word
YES = frozenset(["yes", "y", "true", "t", "1", "x", "np", "nonplastic"])
NO = frozenset(["no", "n", "false", "f", "0", "plastic"])
# Common practice, no source: other words for the choices of columns.toml.
SYNONYMS: Mapping[str, Mapping[str, str]] = MappingProxyType(
    {
        "origin": {"fill": "made ground", "made": "made ground", "embankment fill": "made ground",
                   "top soil": "topsoil", "bedrock": "rock", "in situ": "natural", "native": "natural"},
        "sulfide": {"pos": "positive", "neg": "negative", "traces": "trace"},
        "kind": {"strike": "struck", "static": "standing"},
    }
)  # fmt: skip
_WRITTEN_DATES = ("%Y/%m/%d", "%Y.%m.%d", "%d %b %Y", "%d-%b-%Y", "%d-%b-%y", "%d %B %Y", "%B %d, %Y", "%b %d, %Y")

KINDS = {
    "blank mark": Check("no entry in words", "convert", "", "read as blank; leave such cells blank"),
    "error": Check(
        "failed formula", "reject", "", "the formula of the spreadsheet failed; enter the text from its source"
    ),
    "damaged name": Check(
        "name changed by a spreadsheet",
        "reject",
        "a name as on the log, for example BH-3",
        "a spreadsheet has made a date or an exponent of the name; enter it again, in a cell formatted as text",
    ),
    "synonym": Check("other word for a choice", "convert", "", "read as the nearest of the allowed words"),
    "other": Check("not one of the choices", "reject", "", "use one of the allowed words, or leave the cell blank"),
    "not a flag": Check("not yes or no", "reject", "", "write yes or no, or leave the cell blank"),
    "date written": Check("date in another order", "convert", "", "read as year-month-day; write dates that way"),
    "unclear date": Check(
        "unclear date", "reject", "", "day and month cannot be told apart; write the date as year-month-day"
    ),
    "not a date": Check("not a date", "reject", "", "write the date as year-month-day, for example 2026-04-03"),
}


def read(cells: pd.Series, column: Column) -> pd.DataFrame:
    """Return what each cell of a text, choice, flag or date column says.

    Returns
    -------
    DataFrame
        ``value`` (text, or True and False for a flag; missing where there is none) and ``kind``: blank, ``text`` or
        a key of :data:`KINDS`; same index.

    Examples
    --------
    >>> from geomap.tables.schema import column
    >>> read(pd.Series(["Fill", "Rock"], dtype="string"), column("origin")).values.tolist()
    [['made ground', 'synonym'], ['rock', 'text']]
    """
    codes, uniques = pd.factorize(cells)
    texts = clean(pd.Series(uniques, dtype="string"))
    if column.type == "flag":
        entries = _flags(texts)
    elif column.type == "date":
        entries = _dates(texts)
    elif column.choices:
        entries = _choices(texts, column)
    else:
        entries = _texts(texts, column.name)
    blank = pd.DataFrame({"value": [None], "kind": [""]}, dtype=object)
    every = pd.concat([entries, blank], ignore_index=True)
    return every.take(np.where(codes < 0, len(every) - 1, codes)).set_axis(cells.index)


def names_from_texts(texts: pd.Series) -> pd.Series:
    """Return names with single blanks, so that ``BH  3`` and ``BH 3`` are one name."""
    return texts.str.replace(r"\s+", " ", regex=True)


def _entries(value: object, kind: object) -> pd.DataFrame:
    frame = pd.DataFrame({"value": value, "kind": kind}, dtype=object)
    frame.loc[~frame["kind"].isin(["text", "synonym", "date written"]), "value"] = None
    return frame


def _texts(texts: pd.Series, name: str) -> pd.DataFrame:
    lower = texts.str.lower()
    is_name = name in NAME_COLUMNS
    kind = np.select(
        [
            (texts == "").to_numpy(bool),
            lower.isin(SPREADSHEET_ERRORS).to_numpy(bool),
            lower.isin(MARKS_FOR_BLANK).to_numpy(bool) & (name not in FREE_COLUMNS),
            is_damaged_name(texts) & is_name,
        ],
        ["", "error", "blank mark", "damaged name"],
        "text",
    )
    return _entries((names_from_texts(texts) if is_name else texts).to_numpy(object), kind)


def _choices(texts: pd.Series, column: Column) -> pd.DataFrame:
    plain = texts.str.lower().str.replace(r"[\s_-]+", " ", regex=True)
    direct = plain.map({choice.lower(): choice for choice in column.choices})
    other = plain.map(dict(SYNONYMS.get(column.name, {})))
    kind = np.select(
        [
            (texts == "").to_numpy(bool),
            direct.notna().to_numpy(bool),
            other.notna().to_numpy(bool),
            texts.str.lower().isin(MARKS_FOR_BLANK).to_numpy(bool),
        ],
        ["", "text", "synonym", "blank mark"],
        "other",
    )
    return _entries(direct.astype(object).where(direct.notna(), other).to_numpy(object), kind)


def _flags(texts: pd.Series) -> pd.DataFrame:
    lower = texts.str.lower()
    yes = lower.isin(YES).to_numpy(bool) | is_nonplastic(lower)
    no = lower.isin(NO).to_numpy(bool)
    mark = lower.isin(MARKS_FOR_BLANK).to_numpy(bool)
    kind = np.select([(texts == "").to_numpy(bool), yes | no, mark], ["", "text", "blank mark"], "not a flag")
    return _entries(yes, kind)


def _dates(texts: pd.Series) -> pd.DataFrame:
    day = texts.str.replace(r"[ T]\d{1,2}:\d{2}.*$", "", regex=True)
    iso = pd.to_datetime(day, format="%Y-%m-%d", errors="coerce")
    written = pd.Series(pd.NaT, texts.index, dtype="datetime64[ns]")
    for form in _WRITTEN_DATES:
        written = written.fillna(pd.to_datetime(day, format=form, errors="coerce").astype("datetime64[ns]"))
    parts = day.str.extract(r"^(\d{1,2})[/.-](\d{1,2})[/.-](\d{4})$").astype("Float64")
    first, second = (parts[i].to_numpy(dtype=float, na_value=np.nan) for i in (0, 1))
    ordered = pd.to_datetime(day.str.replace(r"[/.-]", "-", regex=True), format="%d-%m-%Y", errors="coerce")
    turned = pd.to_datetime(day.str.replace(r"[/.-]", "-", regex=True), format="%m-%d-%Y", errors="coerce")
    numeric = ordered.where((first > 12) | (first == second), turned)
    unclear = (first <= 12) & (second <= 12) & (first != second)
    written = written.fillna(numeric.where(~unclear).astype("datetime64[ns]"))
    kind = np.select(
        [
            (texts == "").to_numpy(bool),
            iso.notna().to_numpy(bool),
            texts.str.lower().isin(MARKS_FOR_BLANK).to_numpy(bool),
            unclear,
            written.notna().to_numpy(bool),
        ],
        ["", "text", "blank mark", "unclear date", "date written"],
        "not a date",
    )
    found = iso.astype("datetime64[ns]").fillna(written)
    return _entries(found.dt.strftime("%Y-%m-%d").to_numpy(object), kind)
