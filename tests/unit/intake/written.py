"""Tables as an engineer writes them down, made into what a reader hands over."""

from __future__ import annotations

import pandas as pd

from geomap.intake import Intake
from geomap.tables.raw import Heading, RawTable
from geomap.units import factor_from_spelling


def raw(layout: str, text: str, file: str = "", sheet: str = "", first_row: int = 2) -> RawTable:
    """Return a table written with a bar between cells; its first line holds the headings.

    A heading is the name of a column, or ``heading:column``, or ``heading:column:unit``. The rows are numbered from
    `first_row`, as a spreadsheet with one heading row shows them.
    """
    first, *lines = [line.strip() for line in text.strip().splitlines()]
    headings = {}
    for cell in first.split("|"):
        found, _, rest = cell.strip().partition(":")
        name, _, unit = rest.partition(":")
        name = name or found
        factor = factor_from_spelling(name.rsplit("_", 1)[-1], unit) if unit else 1.0
        assert factor is not None
        headings[name] = Heading(found, name, factor, unit)
    rows = [[cell.strip() or None for cell in line.split("|")] for line in lines]
    index = range(first_row, first_row + len(rows))
    cells = pd.DataFrame(rows, columns=list(headings), index=index, dtype="string")
    return RawTable(layout, file or f"{layout}.csv", sheet, cells, headings, cells.copy())


BORINGS = """
boring | x   | y  | ground_level_m | depth_m | date
BH-1   | 100 | 5  | 20.5           | 6       | 2026-03-02
BH-2   | 200 | -4 | 21.0           | 6       | 2026-03-03
BH-3   | 300 | 2  | 20.0           | 8       | 2026-03-04
"""

SAMPLES = """
boring | sample | top_depth_m | base_depth_m | description | visual_group \
       | passing_4_75_mm_pct | passing_0_425_mm_pct | passing_0_075_mm_pct \
       | LL:liquid_limit_pct | PL:plastic_limit_pct | PI:plasticity_index_pct | moisture_pct \
       | cbr_soaked_pct | cbr_density_pct | compaction_method
BH-1 | S1 | 0.5 | 1.0 | Firm brown silty CLAY | CL | 100 | 96 | 82 | 38 | 20 | 18 | 21.5 | 4 | 95 | AASHTO T 99
BH-1 | S2 | 2.0 | 2.5 | Silty fine sand       | SM | 98  | 80 | 24 | NP | NP | NP | 11   |   |    |
BH-2 | S1 | 0.5 | 1.0 | Clayey SAND           | SC | 97  | 70 | 35 | 30 | 17 | 13 | 14   | 7 | 95 | AASHTO T 99
BH-3 | S1 | 1.0 | 1.5 | Grey SILT             | ML |     |    |    | 33 | 27 | 6  | 25   |   |    |
"""

STRATA = """
boring | top_depth_m | base_depth_m | description | origin
BH-1   | 0   | 1.5 | Silty clay | natural
BH-1   | 1.5 | 6   | Silty sand | natural
BH-2   | 0   | 6   | Clayey sand | natural
BH-3   | 0   | 0.5 | Topsoil | topsoil
BH-3   | 0.5 | 8   | Silt | natural
"""

GRADATIONS = """
boring | sample | size_mm | passing_pct
BH-3   | S1     | 4.75    | 100
BH-3   | S1     | 0.425   | 99
BH-3   | S1     | 0.075   | 91
BH-3   | S1     | 0.002   | 12
"""


def clean() -> list[RawTable]:
    """Return four tables in which there is nothing to ask about."""
    return [
        raw("borings", BORINGS),
        raw("samples", SAMPLES),
        raw("strata", STRATA),
        raw("gradations", GRADATIONS),
    ]


def dirty(**texts: str) -> list[RawTable]:
    """Return the clean tables with those named replaced."""
    written = {"borings": BORINGS, "samples": SAMPLES, "strata": STRATA, "gradations": GRADATIONS, **texts}
    return [raw(name, text) for name, text in written.items() if text]


def asked(intake: Intake, check: str) -> pd.DataFrame:
    """Return the findings of one check, and make sure that there are some and that they are complete."""
    found = intake.findings.loc[intake.findings["topic"] == check]
    assert len(found), f"no finding {check!r} among {sorted(set(intake.findings['check']))}"
    for column in ("file", "heading", "found", "allowed", "action", "severity", "advice"):
        assert (found[column].fillna("") != "").all(), column
    return found


def checks(intake: Intake) -> set[str]:
    """Return the names of the checks that asked."""
    return set(intake.findings["topic"])
