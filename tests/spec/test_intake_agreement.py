"""Which laboratory groups and field words go together, and what is asked where they do not.

The pairs are common practice, no source (geomap/intake/agreement.toml); cases constructed from them.
"""

from __future__ import annotations

import pandas as pd
import pytest

from geomap.intake import Intake, accept, agree, screen
from geomap.intake.agreement import main_soil
from tests.unit.intake.written import asked, checks, raw

# laboratory group, field group, go together
GROUPS = [
    ("CL", "CL", True),
    ("CL", "cl", True),
    ("CL", "CL-ML", True),
    ("ML", "CL-ML", True),
    ("ML", "CL", True),
    ("CL", "CH", True),
    ("CH", "MH", True),
    ("SM", "ML", True),
    ("SC", "SM", True),
    ("SP-SM", "SP", True),
    ("SP-SM", "SM", True),
    ("GP", "SP", True),
    ("CL/CH", "CH", True),
    ("OH", "PT", True),
    ("SM", "CL", False),
    ("SP-SM", "ML", False),
    ("SP-SC", "CL", False),
    ("GW", "CL", False),
    ("CH", "SM", False),
    ("ML", "CH", False),
    ("CL", "PT", False),
    ("CL", "CL/CH", True),
    ("SM", "CL/CH", False),  # each of a pair is compared
]
# laboratory group, description, go together
DESCRIPTIONS = [
    ("CL", "Firm brown silty CLAY", True),
    ("CL", "Brown sandy clay with gravel", True),
    ("ML", "Grey SILT", True),
    ("SM", "Silty fine sand", True),
    ("SM", "Stiff clay", False),  # defect 38: lab SM, log 'clay'
    ("SC", "Stiff sandy clay", True),
    ("GW", "Sandy GRAVEL, trace of silt", True),
    ("GW", "SAND and GRAVEL", True),
    ("CH", "Sand lenses in fat CLAY", True),
    ("CH", "sand lenses in fat clay", True),
    ("CL", "Fine SAND with clay", False),
    ("CL", "Black fibrous PEAT", False),
    ("CL", "Topsoil", True),  # no main soil: nothing to compare
    ("SP", "Clayey SAND", True),
    ("CL", "Clayey SAND", True),
    ("CL", "SAND", False),
]


def compared(heading: str, symbol: str, word: str, basis: str = "lab") -> set[str]:
    """Return what is asked about one sample with a laboratory group and one field entry."""
    taken = screen(accept([raw("samples", f"boring | top_depth_m | {heading}\nBH-1 | 1 | {word}")]))
    classified = pd.DataFrame({"uscs_symbol": [symbol], "uscs_symbol_basis": [basis]})
    return checks(agree(taken, classified, no_tests(1)))


def no_tests(rows: int) -> pd.DataFrame:
    """Return records without any result."""
    names = ("passing_0_425_mm_pct", "fines_pct", "liquid_limit_pct", "plasticity_index_pct")
    return pd.DataFrame({**{name: [float("nan")] * rows for name in names}, "is_nonplastic": False})


@pytest.mark.parametrize(("symbol", "field", "together"), GROUPS)
def test_laboratory_and_field_group(symbol: str, field: str, together: bool) -> None:
    said = compared("visual_group", symbol, field) - {"field group of two symbols"}
    assert said == (set() if together else {"laboratory group against field group"})


@pytest.mark.parametrize("word", ["Boulders", "clay", "SILTY SAND"])
def test_a_field_group_that_is_no_symbol_is_not_compared(word: str) -> None:
    assert compared("visual_group", "CH", word) == {"field group is no symbol"}


@pytest.mark.parametrize(("symbol", "words", "together"), DESCRIPTIONS)
def test_laboratory_group_and_description(symbol: str, words: str, together: bool) -> None:
    assert compared("description", symbol, words) == (set() if together else {"laboratory group against description"})


def test_a_visual_group_is_not_compared_with_itself() -> None:
    assert compared("visual_group", "SM", "CL", basis="visual") == set()


def test_an_undetermined_sample_is_not_compared() -> None:
    assert compared("visual_group", None, "CL") == set()  # type: ignore[arg-type]


def test_both_opinions_are_shown() -> None:
    taken = screen(accept([raw("samples", "boring | top_depth_m | log:visual_group\nBH-1 | 1 | CL")]))
    classified = pd.DataFrame({"uscs_symbol": ["SM"], "uscs_symbol_basis": ["lab"]})
    said = asked(agree(taken, classified, no_tests(1)), "laboratory group against field group").iloc[0]
    assert (said["heading"], said["found"], said["action"]) == ("log", "CL; laboratory group SM", "query")


# laboratory group, field group of the sample, of the layer that holds it, what is asked
LAYERS = [
    ("CH", "", "SP", "laboratory group against the layer"),
    ("CH", "", "SC/CL", None),  # next to one of the pair
    ("CH", "", "CL", None),
    ("CH", "", "sp", "laboratory group against the layer"),
    ("CH", "", "Sand", None),  # no symbol: nothing to compare
    ("CH", "", "", None),
    ("CH", "CL", "SP", None),  # the sample's own group is compared, and agrees
    ("CH", "SP", "CH", "laboratory group against field group"),
    ("CH", "Clay", "SP", "laboratory group against the layer"),  # a word is no group
]


def with_layer(symbol: str, own: str, logged: str, basis: str = "lab") -> Intake:
    """Return the intake of one classified sample in the second layer of its boring."""
    tables = [
        raw("samples", f"boring | sample | top_depth_m | base_depth_m | visual_group\nBH-1 | S1 | 2 | 2.5 | {own}"),
        raw(
            "strata",
            f"boring | top_depth_m | base_depth_m | USC:visual_group\nBH-1 | 0 | 2 | CH\nBH-1 | 2 | 6 | {logged}",
        ),
    ]
    classified = pd.DataFrame({"uscs_symbol": [symbol], "uscs_symbol_basis": [basis]})
    return agree(screen(accept(tables)), classified, no_tests(1))


@pytest.mark.parametrize(("symbol", "own", "logged", "said"), LAYERS)
def test_laboratory_group_and_the_layer(symbol: str, own: str, logged: str, said: str | None) -> None:
    about_symbols = {"field group is no symbol", "field group of two symbols"}
    assert checks(with_layer(symbol, own, logged)) - about_symbols == ({said} if said else set())


def test_the_layer_that_the_laboratory_contradicts_is_named() -> None:
    said = asked(with_layer("CH", "", "SP"), "laboratory group against the layer").iloc[0]
    assert said["found"] == "SP in the layer from 2 to 6 m (strata.csv, row 3); laboratory group CH"
    assert (said["action"], said["file"], said["row_number"], said["sample"]) == ("query", "samples.csv", 2, "S1")


def test_a_group_by_eye_is_not_compared_with_the_layer_it_comes_from() -> None:
    assert checks(with_layer("SP", "", "CH", basis="visual")) == set()


def test_organic_soil_without_an_organic_test_is_asked_about() -> None:
    assert compared("description", "CL", "Dark organic CLAY") == {"organic by description, not tested"}
    assert compared("description", "OL", "Dark organic CLAY") == set()
    assert compared("description", "CL", "Grey CLAY with organic traces") == set()


@pytest.mark.parametrize(
    ("text", "main"),
    [
        ("Medium dense, brown, clayey, fine SAND, trace gravel", "clayey sand"),
        ("Trace gravel; sandy silty clay", "silty clay"),
        ("Peaty CLAY", "organic clay"),
        ("Inorganic SILT", "silt"),
        ("MADE GROUND: SANDY GRAVEL", "gravel"),
        ("Sand/silt", "sand/silt"),
        ("Concrete", None),
    ],
)
def test_the_main_soil_of_a_description(text: str, main: str | None) -> None:
    found = main_soil(pd.Series([text], dtype="string")).iloc[0]
    assert (None if pd.isna(found) else found) == main


def test_limits_that_the_gradation_does_not_bear_out_are_asked_about() -> None:
    text = """
    boring | top_depth_m | LL:liquid_limit_pct | PI:plasticity_index_pct
    BH-1   | 1           | 40                  | 12
    BH-1   | 2           | 60                  | NP
    BH-1   | 3           | 40                  | 12
    """
    taken = screen(accept([raw("samples", text)]))
    records = pd.DataFrame(
        {
            "passing_0_425_mm_pct": [1.0, 99, 60],
            "fines_pct": [0.5, 95, 40],
            "liquid_limit_pct": [40.0, 60, 40],
            "plasticity_index_pct": [12, float("nan"), 12],
            "is_nonplastic": [False, True, False],
        }
    )
    classified = pd.DataFrame({"uscs_symbol": [None] * 3, "uscs_symbol_basis": [None] * 3})
    taken = agree(taken, classified, records)
    assert asked(taken, "plasticity without fine soil")["found"].tolist() == ["LL 40, PI 12; 1 % passes 0.425 mm"]
    assert asked(taken, "NP with fines and a high liquid limit")["found"].tolist() == ["LL 60, PI NP; 95 % fines"]
    assert len(taken.findings) == 2
