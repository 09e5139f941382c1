"""Samples against the layers that hold them: origin, unit, and one spelling of each unit."""

from __future__ import annotations

import pytest

from geomap.ground.records import with_log
from geomap.intake import Intake, accept, screen
from geomap.intake.strata import holding, of_layer
from tests.unit.intake.written import asked, checks, raw

STRATA = """
boring | top_depth_m | base_depth_m | origin      | unit
BH-1   | 0           | 1            | made ground | Fill
BH-1   | 1           | 3            | natural     | River clay
BH-1   | 3           | 4            |             |
BH-1   | 4           | 6            | weathered rock |
BH-2   | 0           | 6            | natural     | River clay
"""


def logged(*samples: str, strata: str = STRATA) -> Intake:
    """Return the intake of samples (boring, name, top, base, origin, unit) beside the logged layers."""
    text = "\n".join(["boring | sample | top_depth_m | base_depth_m | Origin:origin | Geology:unit", *samples])
    return screen(accept([raw("samples", text), raw("strata", strata, file="log.xlsx", sheet="Strata")]))


@pytest.mark.parametrize(
    ("sample", "topic", "heading", "found"),
    [
        (
            "BH-1 | S1 | 0.2 | 0.6 | natural | ",
            "origin against the layer",
            "Origin",
            "natural; made ground in the layer from 0 to 1 m (log.xlsx, sheet Strata, row 2)",
        ),
        (
            "BH-1 | S1 | 1.2 | 1.6 | natural | Old clay",
            "unit against the layer",
            "Geology",
            "Old clay; River clay in the layer from 1 to 3 m (log.xlsx, sheet Strata, row 3)",
        ),
        (
            "BH-1 | S1 | 5 | | natural | Old clay",
            "origin against the layer",
            "Origin",
            "natural; weathered rock in the layer from 4 to 6 m (log.xlsx, sheet Strata, row 5)",
        ),
    ],
)
def test_a_sample_and_its_layer_that_differ_are_both_named(sample: str, topic: str, heading: str, found: str) -> None:
    taken = logged(sample)
    said = asked(taken, topic).iloc[0]
    assert said[["action", "file", "row_number", "heading", "sample"]].tolist() == [
        *("query", "samples.csv", 2, heading, "S1")
    ]
    assert said["found"] == found
    assert checks(taken) == {topic}
    assert len(taken.used("samples")) == 1


@pytest.mark.parametrize(
    "sample",
    [
        "BH-1 | S1 | 0.2 | 0.6 | Made Ground | FILL ",
        "BH-1 | S1 | 0.2 | 0.6 | | ",
        "BH-1 | S1 | 0.8 | 1.6 | natural | River clay",  # its middle, 1.2 m, lies in the second layer
        "BH-1 | S1 | 3.5 | | rock | Chalk",  # the layer says nothing
        "BH-1 | S1 | 6.5 | | rock | Chalk",  # no layer holds it
        "BH-1 | S1 | 5 | | weathered rock | Chalk",  # the layer names no unit
        "BH-3 | S1 | 0.5 | | rock | Chalk",  # nobody logged this boring
    ],
)
def test_a_sample_that_goes_with_its_layer_is_not_asked_about(sample: str) -> None:
    assert not {topic for topic in checks(logged(sample)) if "against the layer" in topic}


def test_both_may_differ_at_once() -> None:
    assert checks(logged("BH-1 | S1 | 0.2 | 0.6 | rock | Chalk")) == {
        "origin against the layer",
        "unit against the layer",
    }


def test_a_layer_left_out_is_not_compared() -> None:
    strata = STRATA + "BH-9 | 0 | 2 | |\nBH-9 | 4 | 2 | rock | Chalk\n"
    taken = logged("BH-9 | S1 | 3 | | natural | Clay", strata=strata)
    assert checks(taken) == {"top below base"}


def test_many_differences_of_one_kind_are_said_once() -> None:
    samples = [f"BH-2 | S{n} | {n / 10} | | rock |" for n in range(30)]
    said = asked(logged(*samples), "origin against the layer")
    assert said["found"].str.endswith("(in 30 rows: 2-31)").tolist() == [True]


def test_units_that_differ_in_capitals_and_blanks_are_taken_as_one() -> None:
    taken = logged(
        "BH-1 | S1 | 1.2 | | | river CLAY",
        "BH-1 | S2 | 1.5 | | | River  clay",
        "BH-2 | S1 | 1 | | | river CLAY",
        "BH-2 | S2 | 2 | | | River clay",
    )
    said = asked(taken, "unit spelled otherwise")
    assert said["found"].tolist() == [
        "river CLAY (taken as River clay) (in 2 rows: 2, 4)",
        "River  clay (taken as River clay)",
    ]
    assert said[["action", "severity", "heading"]].values.tolist() == [["convert", "note", "Geology"]] * 2
    assert set(taken.used("samples")["unit"]) == {"River clay"}
    assert checks(taken) == {"unit spelled otherwise"}


def test_the_spelling_of_the_log_goes_before_that_of_the_samples() -> None:
    strata = "boring | top_depth_m | base_depth_m | unit\nBH-1 | 0 | 2 | Alluvium\nBH-1 | 2 | 4 | ALLUVIUM"
    taken = logged("BH-1 | S1 | 1 | | | alluvium", strata=strata)
    assert taken.used("strata")["unit"].tolist() == ["Alluvium", "Alluvium"]
    assert taken.used("samples")["unit"].tolist() == ["Alluvium"]
    assert asked(taken, "unit spelled otherwise")["file"].tolist() == ["log.xlsx", "samples.csv"]


def test_the_layer_is_the_one_that_a_sample_takes_its_unit_from() -> None:
    strata = STRATA.replace("weathered rock |", "weathered rock | Gneiss") + "BH-2 | 5 | 8 | natural | Gravel\n"
    depths = [0, 0.5, 1, 2.9, 3, 3.5, 4, 5.5, 6, 7]
    names = (1, 2, 3)
    taken = logged(*(f"BH-{n} | S{i} | {depth} | | |" for n in names for i, depth in enumerate(depths)), strata=strata)
    layer = holding(taken)
    assert layer.tolist() == [0, 0, 1, 1, 2, 2, 3, 3, 3, -1, *[4] * 7, 5, 5, 5, *[-1] * 10]
    from_log = with_log(taken.used("samples"), taken.used("strata"))["unit"].fillna("")
    assert from_log.tolist() == of_layer(taken["strata"], layer, "unit").fillna("").tolist()


def test_of_layers_within_each_other_the_inner_one_holds_a_sample_where_it_reaches() -> None:
    strata = "boring | top_depth_m | base_depth_m | unit\nBH-1 | 0 | 6 | Clay\nBH-1 | 1 | 2 | Lens"
    taken = logged(*(f"BH-1 | S{depth} | {depth} | | |" for depth in (0.5, 1, 2, 3, 6, 7)), strata=strata)
    assert holding(taken).tolist() == [0, 1, 1, 0, 0, -1]
