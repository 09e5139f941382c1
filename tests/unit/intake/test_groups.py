"""Field groups: symbols, pairs of symbols, and words that are neither."""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.intake import SOIL_CHECKS, Intake, accept, screen
from geomap.intake.groups import kinds, symbols
from geomap.soils.properties import by_visual_group
from geomap.soils.systems import astm_d2487
from tests.unit.intake.written import asked, checks, raw


def written(*groups: str, layout: str = "samples") -> Intake:
    """Return the intake of rows with these field groups."""
    columns = {"samples": "boring | top_depth_m", "strata": "boring | top_depth_m | base_depth_m"}[layout]
    depths = ["1", "0 | 2"][layout == "strata"]
    rows = [f"BH-{number} | {depths} | {group}" for number, group in enumerate(groups, start=1)]
    return screen(accept([raw(layout, "\n".join([f"{columns} | log:visual_group", *rows]))]))


def test_the_symbols_are_those_that_soils_are_classified_with() -> None:
    assert set(symbols().values()) == set(astm_d2487.SYMBOLS)


@pytest.mark.parametrize("text", [*symbols(), "cl", " sp - sm ", "Cl/Ch", "Clay", "CL?", "A-6", "SP-CL"])
def test_intake_and_soils_take_the_same_texts_for_symbols(text: str) -> None:
    kind = kinds(pd.Series([text], dtype="string")).iloc[0]
    code = int(by_visual_group(pd.DataFrame({"visual_group": [text]}))[0][0])
    assert kind == (astm_d2487.SYMBOLS[code - 1] if code > 0 else kind)
    assert (kind in ("pair", "no symbol")) == (code == -1)


@pytest.mark.parametrize("layout", ["samples", "strata"])
def test_a_symbol_in_any_spelling_or_none_is_not_asked_about(layout: str) -> None:
    assert written(*symbols(), "cl", "SP - SM", "gm-gc", "", "-", layout=layout).findings["topic"].tolist() == [
        "no entry in words"
    ]


@pytest.mark.parametrize("layout", ["samples", "strata"])
@pytest.mark.parametrize(
    ("text", "topic", "start"),
    [
        ("Clay", "field group is no symbol", "kept as written but used as no group; write a symbol such as CL"),
        ("A-7-6", "field group is no symbol", "kept as written but used as no group; write a symbol such as CL"),
        ("CL/CH", "field group of two symbols", "kept as written but not used as one symbol"),
        ("SP-SM / SM", "field group of two symbols", "kept as written but not used as one symbol"),
        ("CL-CH", "field group of two symbols", "kept as written but not used as one symbol"),
        ("CL/clay", "field group is no symbol", "kept as written but used as no group; write a symbol such as CL"),
    ],
)
def test_a_field_group_that_is_no_symbol_is_asked_about(layout: str, text: str, topic: str, start: str) -> None:
    taken = written("CL", text, layout=layout)
    said = asked(taken, topic).iloc[0]
    assert said[["action", "file", "row_number", "heading", "found"]].tolist() == [
        *("query", f"{layout}.csv", 3, "log", text)
    ]
    assert said["advice"].startswith(start)
    assert checks(taken) == {topic}
    assert taken.used(layout)["visual_group"].tolist() == ["CL", text]  # kept as written


def test_one_word_in_many_rows_is_said_once() -> None:
    taken = written("Clay", "CL", "Clay", "Sand", "Clay")
    assert taken.findings["found"].tolist() == ["Clay (in 3 rows: 2, 4, 6)", "Sand"]


def test_a_laboratory_table_alone_is_asked_too() -> None:
    taken = screen(accept([raw("samples", "visual_group\nClay")]), SOIL_CHECKS)
    assert checks(taken) == {"field group is no symbol"}
