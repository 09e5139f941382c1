"""What one entry of a number column says: a number, a bound, NP, no result, or something to ask about.

Entries are judged once for each different text, so the work grows with the variety of a column, not its length.
"""

from __future__ import annotations

import numpy as np
import pandas as pd

from geomap.intake.damage import is_date
from geomap.tables.findings import Check
from geomap.tables.schema import Column
from geomap.units import factor_from_spelling

# Common practice, no source: what people write where a test was not made.
_DASHES = ("-", "--", "---", "\u2013", "\u2014")
MARKS_FOR_BLANK = frozenset([*_DASHES, "?", "n/a", "n.a.", "#n/a", "nil", "none", "null", "nan"])
WORDS_FOR_NO_RESULT = MARKS_FOR_BLANK | frozenset(
    ["na", "n.a", "nd", "n.d.", "nt", "n.t.", "nr", "n.r.", ".", "tba", "tbc", "pending", "missing", "blank",
     "not tested", "not done", "not determined", "not applicable", "no result", "no data", "not available"]
)  # fmt: skip
CODES_FOR_NO_RESULT = (-999.0, -999.9, -999.25, -9999.0, -9999.9, -99999.0)
POSSIBLE_CODES = (999.0, 9999.0)
SPREADSHEET_ERRORS = frozenset(
    ["#ref!", "#value!", "#div/0!", "#name?", "#num!", "#null!", "#spill!", "#calc!", "#####"]
)
NONPLASTIC_SPELLINGS = frozenset({"np", "nonplastic", "notplastic"})  # letters only, lower case
NONPLASTIC_CODE = -1.0
SPT_REFUSAL_BLOWS = 50  # blows at which driving stops: common practice, no source
SPT_LENGTH_MM = 300  # N counts blows for 0.3 m

_NUMBER = r"[+-]?(?:\d+\.?\d*|\.\d+)(?:e[+-]?\d+)?"
_SPLIT = rf"^(?P<sign>[<>≤≥]=?|=[<>])?\s*(?P<number>{_NUMBER})\s*(?P<rest>.*)$"
_SEPARATED = r"[+-]?\d{1,3}(?:[ ,'\u2019]\d+)+(?:[.,]\d+)?|[+-]?\d+,\d+"
_REFUSAL = r"(?P<blows>\d+)\s*(?:/|for)\s*(?P<length>\d+(?:\.\d+)?)\s*(?P<unit>mm|cm|in|inch|inches|\"|\u201d|'')?"

KINDS = {
    "no result": Check(
        "no result in words",
        "convert",
        "",
        "read as not tested; leave such cells blank, and where a result of zero is meant write 0",
    ),
    "code": Check(
        "code for no result", "convert", "", "read as not tested; leave the cell blank where there is no result"
    ),
    "error": Check(
        "failed formula", "reject", "", "the formula of the spreadsheet failed; enter the value from its source"
    ),
    "date": Check(
        "date in place of a number",
        "reject",
        "",
        "a spreadsheet has made a date of the entry; enter it again from its source, in a cell formatted as text",
    ),
    "separator": Check(
        "unclear separator",
        "reject",
        "",
        "write the number without spaces or commas and with a point before decimals",
    ),
    "text": Check("not a number", "reject", "", "write one number in the cell and words in the remarks"),
    "same unit": Check("unit in the cell", "convert", "", "the unit is that of the column and was taken off"),
    "other unit": Check(
        "other unit in the cell",
        "reject",
        "",
        "give the value in the unit of the heading and leave the unit out of the cell",
    ),
    "or equal": Check("or equal", "convert", "", "kept as less than or more than the number"),
    "refusal": Check(
        "driving refusal", "convert", "", "kept as more than the blows driven, because the full 0.3 m was not reached"
    ),
    "bound": Check(
        "less than or more than",
        "reject",
        "",
        "this column takes measured values only; give the number or leave it blank",
    ),
    "possible code": Check(
        "possible code for no result", "query", "", "used as a number; if it stands for no result, clear the cell"
    ),
}


def clean(texts: pd.Series) -> pd.Series:
    """Return texts without outer blanks, text marks of spreadsheets and typographic minus signs.

    Examples
    --------
    >>> clean(pd.Series([" 12.5", "'007", "\u22123"], dtype="string")).tolist()
    ['12.5', '007', '-3']
    """
    plain = texts.str.replace("[\u00a0\u2007\u2009\u202f]", " ", regex=True).str.replace("\u2212", "-", regex=False)
    return plain.str.strip().str.replace("^'", "", regex=True)


def read(cells: pd.Series, column: Column, factor: float = 1.0) -> pd.DataFrame:
    """Return what each cell of a number column says.

    Parameters
    ----------
    cells
        Texts as found; a blank cell is missing.
    column
        The column they stand in.
    factor
        Factor from the unit of the heading to the unit of the column; a unit in a cell must have the same one.

    Returns
    -------
    DataFrame
        ``value`` (float, in the unit of the heading), ``bound`` (blank, ``<`` or ``>``) and ``kind``: blank,
        ``number``, ``np`` or a key of :data:`KINDS`; same index.

    Examples
    --------
    >>> from geomap.tables.schema import column
    >>> read(pd.Series(["<2", "n/a", "5"], dtype="string"), column("cbr_soaked_pct")).values.tolist()
    [[2.0, '<', 'number'], [nan, '', 'no result'], [5.0, '', 'number']]
    """
    codes, uniques = pd.factorize(cells)
    texts = pd.Series(uniques, dtype="string")
    entries = _plain_numbers(texts) if _are_plain(texts) else _read_texts(texts, column, factor)
    blank = pd.DataFrame({"value": [np.nan], "bound": [""], "kind": [""]})
    every = pd.concat([entries, blank], ignore_index=True)  # code -1 is a missing cell: the last row
    return every.take(np.where(codes < 0, len(every) - 1, codes)).set_axis(cells.index)


def _are_plain(texts: pd.Series) -> bool:
    """Return whether every text is digits with or without a point, and none a code: the usual column."""
    if not bool(texts.str.fullmatch(r"\d+(?:\.\d+)?").all()):
        return False
    return not bool(texts.astype(float).isin(POSSIBLE_CODES).any())


def _plain_numbers(texts: pd.Series) -> pd.DataFrame:
    return pd.DataFrame({"value": texts.astype(float), "bound": "", "kind": "number"}).astype(
        {"bound": object, "kind": object}
    )


def _read_texts(texts: pd.Series, column: Column, factor: float) -> pd.DataFrame:
    plain = clean(texts).str.lower()
    parts = plain.str.extract(_SPLIT)
    value = parts["number"].astype("Float64").to_numpy(dtype=float, na_value=np.nan)
    sign = parts["sign"].fillna("").str.replace("≤", "<=").str.replace("≥", ">=").to_numpy(dtype=object)
    rest = parts["rest"].fillna("")
    if column.unit == "pct":
        rest = rest.mask(rest == "%", "")  # as a spreadsheet shows a percentage
    is_number = np.isfinite(value) & (rest == "").to_numpy(dtype=bool)
    same_unit = np.isfinite(value) & (rest != "").to_numpy(dtype=bool) & _has_unit(rest, column, factor)
    other_unit = np.isfinite(value) & ~same_unit & _has_unit(rest, column, None)
    kind = np.select(
        [
            (plain == "").to_numpy(dtype=bool),
            plain.isin(WORDS_FOR_NO_RESULT).to_numpy(dtype=bool),
            plain.isin(SPREADSHEET_ERRORS).to_numpy(dtype=bool),
            is_nonplastic(plain) & column.nonplastic,
            is_date(plain),
            plain.str.fullmatch(_SEPARATED).fillna(False).to_numpy(dtype=bool),
            (is_number | same_unit) & (sign != "") & (not column.censored),
            is_number & np.isin(value, CODES_FOR_NO_RESULT) & (sign == ""),
            is_number & np.isin(value, POSSIBLE_CODES) & (sign == "") & (column.unit not in ("crs", "")),
            is_number & np.isin(sign, ["<=", ">=", "=<", "=>"]),
            is_number,
            same_unit,
            other_unit,
        ],
        ["", "no result", "error", "np", "date", "separator", "bound", "code", "possible code", "or equal", "number",
         "same unit", "other unit"],
        "text",
    ).astype(object)  # fmt: skip
    bound = np.select([np.isin(sign, ["<", "<=", "=<"]), sign == ""], ["<", ""], ">").astype(object)
    if column.name == "spt_n":
        value, bound, kind = _with_refusals(plain, value, bound, kind)
    kept = np.isin(kind, ["number", "possible code", "or equal", "same unit", "refusal"])
    return pd.DataFrame(
        {"value": np.where(kept, value, np.nan), "bound": np.where(kept, bound, "").astype(object), "kind": kind}
    )


def is_nonplastic(plain: pd.Series) -> np.ndarray:
    """Return True where a lower-case text is a spelling of NP.

    Examples
    --------
    >>> is_nonplastic(pd.Series(["np", "n.p.", "n/p", "non-plastic", "20"], dtype="string")).tolist()
    [True, True, True, True, False]
    """
    return plain.str.replace(r"[\s./_-]", "", regex=True).isin(NONPLASTIC_SPELLINGS).to_numpy(dtype=bool)


def _has_unit(rest: pd.Series, column: Column, factor: float | None) -> np.ndarray:
    """Return True where `rest` spells a unit of the column, with that factor if one is given."""
    if column.unit in ("", "crs"):
        return np.zeros(len(rest), dtype=bool)
    factors = {text: factor_from_spelling(column.unit, text) for text in rest.unique()}
    known = rest.map(factors).astype("Float64").to_numpy(dtype=float, na_value=np.nan)
    return np.isfinite(known) if factor is None else np.isclose(known, factor, rtol=1e-9)


def _with_refusals(
    plain: pd.Series, value: np.ndarray, bound: np.ndarray, kind: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """Read ``50/75 mm`` as more than 50 blows: the driving stopped before 0.3 m."""
    parts = plain.str.extract(f"^{_REFUSAL}$")
    blows = parts["blows"].astype("Float64").to_numpy(dtype=float, na_value=np.nan)
    length = parts["length"].astype("Float64").to_numpy(dtype=float, na_value=np.nan)
    unit = parts["unit"].fillna("")
    in_mm = np.select([(unit == "mm").to_numpy(bool), (unit == "cm").to_numpy(bool)], [1.0, 10.0], 25.4)
    # Without a unit, up to 12 can only be inches and from 13 on only millimeters of a 0.3 m drive.
    in_mm = np.where((unit == "").to_numpy(bool) & (length > 12), 1.0, in_mm)
    refused = (kind == "text") & (blows >= SPT_REFUSAL_BLOWS) & (length * in_mm < SPT_LENGTH_MM)
    return np.where(refused, blows, value), np.where(refused, ">", bound), np.where(refused, "refusal", kind)
