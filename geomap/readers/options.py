"""What a corridor file may say about reading one table."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field


@dataclass(frozen=True)
class TableOptions:
    """How to read one file, where its headings do not say it.

    Attributes
    ----------
    sheet
        Sheet of a workbook; blank: the one that has the headings of the layout. Where `layer` is blank it names
        the layer of a GeoPackage too.
    layer
        Layer of a spatial file; blank: the one that has the headings of the layout.
    columns
        Column of geomap -> heading of the file that means it. It goes before every alias.
    length_unit
        ``"m"``, ``"ft"`` or ``"us-ft"``: unit of lengths whose heading, and units row, state none.
    delimiter
        Delimiter of a text file, or one of the words comma, semicolon, tab, pipe, space; blank: found by trial.
    """

    sheet: str = ""
    layer: str = ""
    columns: Mapping[str, str] = field(default_factory=dict)
    length_unit: str = "m"
    delimiter: str = ""
