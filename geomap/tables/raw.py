"""What a reader hands over: cells as text, and for each column what its heading was taken to mean."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field

import pandas as pd


@dataclass(frozen=True)
class Heading:
    """One column of a file: the heading as found, and the column of geomap that it was taken for."""

    found: str
    column: str
    factor: float = 1.0
    unit: str = ""


@dataclass(frozen=True)
class RawTable:
    """Rows of one file, sheet or layer, as text, before any value is judged.

    Attributes
    ----------
    layout
        Name of the input layout, for example ``"samples"``.
    file, sheet
        Name of the file (no folder) and of the sheet or layer; ``sheet`` is blank for a text file.
    cells
        One column for each recognized column of geomap, dtype ``string``; a blank cell is missing. The index
        is the row number in the file as a spreadsheet shows it.
    headings
        For each column of `cells`, its heading, its unit, and the factor to the house unit.
    original
        Every column of the file as found, unrecognized ones too, on the same index.
    unrecognized
        Headings that no column of the layout answers to.
    crs
        Coordinate reference system that the file itself states, or blank.
    findings
        What the reader noticed: rows and layout as in `geomap.tables.findings`.
    """

    layout: str
    file: str
    sheet: str
    cells: pd.DataFrame
    headings: Mapping[str, Heading]
    original: pd.DataFrame
    unrecognized: tuple[str, ...] = ()
    crs: str = ""
    findings: pd.DataFrame = field(default_factory=pd.DataFrame)
