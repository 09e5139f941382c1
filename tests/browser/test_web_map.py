"""The page in a browser: what a person does with it, by mouse and by keyboard, without a network."""

from __future__ import annotations

import dataclasses
import shutil
import subprocess
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
import shapely

from geomap.results import Results
from geomap.tables import schema
from tests.browser.conftest import WIDTHS, Opened, Write
from tests.unit.exports.sample import BORING_DISTANCE_M, STEP_M, STEPS, chainage, sample_results
from tests.unit.exports.web_corridor import large_results

pytestmark = pytest.mark.browser

Open = Callable[..., Opened]
LENGTH_M = STEPS * STEP_M
GLOBALS = "Object.keys(window).sort().join()"
HOSTILE = {
    "template": "{{7*7}}",
    "script": "</script><script>alert(1)</script>",
    "image": "<img src=x onerror=alert(1)>",
    "literal": "`${alert(1)}`",
    "formula": "=cmd|' /C calc'!A0",
    "long": "W" * 300,
    "right_to_left": "\u202e\u05e7\u05d9\u05d3\u05d5\u05d7 12 \u0628\u0626\u0631",
}


@pytest.fixture(scope="session")
def small(written: Write) -> Path:
    """The page of the invented corridor of 600 m."""
    return written(sample_results())


@pytest.fixture(scope="session")
def large(written: Write) -> Path:
    """The page of the constructed corridor of 8 km."""
    return written(large_results())


@pytest.fixture
def page(open_page: Open, small: Path) -> Opened:
    return open_page(small)


@pytest.fixture(scope="module")
def benign_globals(chromium: Any, small: Path) -> str:
    """The names that the browser's global object has with a harmless page."""
    page = chromium.new_page()
    page.goto(small.as_uri())
    page.wait_for_selector("html[data-ready]", state="attached")
    names: str = page.evaluate(GLOBALS)
    page.close()
    return names


def boring_pixel(page: Opened, distance: float) -> float:
    """Return the share of the profile's width at which a distance stands, from two places that were read off."""
    seen = []
    for share in (0.3, 0.8):
        page.point(share)
        seen.append((share, page.distance))
    (a, at_a), (b, at_b) = seen
    return a + (b - a) * (distance - at_a) / (at_b - at_a)


@pytest.mark.parametrize("width", WIDTHS)
def test_it_opens_without_a_network_a_request_or_a_complaint(open_page: Open, large: Path, width: int) -> None:
    page = open_page(large, width)
    for color in ("group", "suitability", "unsuitable", "evidence"):
        page.page.select_option("#color-by", color)
        page.settle()
        page.shot(f"{width}_{color}")
    page.page.select_option("#color-by", "group")
    page.go_to("BH-12")
    page.shot(f"{width}_boring")
    page.press("Escape")
    page.point(0.45)
    page.shot(f"{width}_stretch")
    assert page.page.evaluate("document.documentElement.scrollWidth") <= width  # nothing hangs over the side
    assert page.requests == []
    assert page.complaints == []


def test_the_title_block_says_what_the_tables_say(page: Opened, results: Results) -> None:
    assert page.text("#corridor-name") == results.name
    assert "Issue A, for review" in page.text("#corridor-line")
    assert page.text("#length") == "600 m"
    assert page.text("#borings-used") == "3 used, 1 left out"
    assert [page.text(f"#total-{word}") for word in ("error", "warning", "note")] == ["1", "2", "0"]
    table = results.tables["subgrade"]
    for word in ("suitable", "treat", "unsuitable", "not assessed"):
        meters = int(STEP_M * (table["suitability"] == word).sum())
        head = page.page.get_by_role("rowheader", name=word, exact=True)
        row = page.page.locator("#lengths tbody tr").filter(has=head)
        assert row.locator("td").first.inner_text() == f"{meters} m"
    for caution in results.cautions:
        assert caution in page.text("#cautions")
    assert page.page.locator("#cautions").is_visible()


def test_the_pointer_on_the_profile_marks_the_plan_and_the_plan_marks_the_profile(page: Opened) -> None:
    assert page.on_plan is None
    page.point(0.62)
    there = page.distance
    assert 0 < there < LENGTH_M
    assert page.on_plan == pytest.approx(there, abs=0.1)
    mark = page.box(".plan-cursor")
    page.point(0.2)
    assert abs(page.distance - there) > 100
    page.page.mouse.move(mark["x"] + mark["width"] / 2, mark["y"] + mark["height"] / 2)
    page.settle()
    assert page.distance == pytest.approx(there, abs=3.0)  # one pixel of the plan is about 2 m
    assert page.on_plan == pytest.approx(there, abs=3.0)


def test_the_plan_has_a_scale_bar_in_the_corridor_unit_and_north_up(
    open_page: Open, page: Opened, written: Write
) -> None:
    assert page.text(".leaflet-control-scale").endswith(" m")
    assert page.page.get_by_role("img", name="North is up").is_visible()
    feet = open_page(written(sample_results(length_unit="us-ft")))
    assert feet.text(".leaflet-control-scale").endswith(" ft")


def test_a_click_holds_the_place_and_pans_the_plan(page: Opened) -> None:
    page.point(0.1)
    page.page.mouse.down()
    page.page.mouse.up()
    page.settle()
    held = page.distance
    page.point(0.9)
    assert page.distance > held + 100
    page.page.mouse.move(1300, 700)
    page.settle()
    assert page.distance == pytest.approx(held, abs=0.1)
    page.page.wait_for_timeout(400)  # the plan glides
    mark, plan = page.box(".plan-cursor"), page.box(".folium-map")
    assert mark["x"] + mark["width"] / 2 == pytest.approx(plan["x"] + plan["width"] / 2, abs=3)


def test_the_stretch_card_says_what_the_tables_say(page: Opened, results: Results) -> None:
    for step in (3, 24, 29, 47):
        row = results.tables["subgrade"].iloc[step - 1]
        page.go_to(chainage((step - 0.5) * STEP_M))
        card = page.text("#stretch")
        assert f"Chainage {chainage((step - 0.5) * STEP_M)}" in card
        assert page.text("#stretch .verdict-word") == row["suitability"]
        assert f"{'cut' if row['cut_fill_m'] < 0 else 'fill'} {abs(row['cut_fill_m']):.2f} m" in card
        assert f"Evidence {row['evidence']}" in card
        assert f"{row['nearest_boring']}, {row['nearest_boring_m']:.0f} m away" in card
        if row["p_unsuitable"] > 0:
            assert f"unsuitable {round(100 * row['p_unsuitable'])}%" in card
        trace = results.tables["trace"].query("step == @step").sort_values("weight", ascending=False)
        first = page.page.locator(".behind tbody tr").first.inner_text()
        assert f"{100 * trace['weight'].iloc[0]:.1f}%" in first
        assert page.page.locator(".behind tbody tr").count() == len(trace)
        assert trace["lab_sheet"].iloc[-1] in card


def test_the_odds_are_those_of_the_cell_pointed_at(page: Opened, results: Results) -> None:
    page.go_to(chainage(295.0))
    for _ in range(20):
        page.press("ArrowUp")
    page.press("ArrowDown", times=4)
    cells = results.tables["profile_cells"]
    cell = cells.loc[(cells["from_distance_m"] == 290.0) & (cells["top_depth_m"] == 2.0)].iloc[0]
    assert "Soil group 2.00 to 2.50 m below ground" in page.text("#stretch")
    likeliest = page.page.locator("#stretch .share-list").last.locator("li").first
    assert cell["soil_group"] in likeliest.inner_text()
    assert f"{100 * cell['probability']:.0f}%" in likeliest.inner_text()


def test_a_click_on_a_boring_in_the_plan_opens_its_card(page: Opened) -> None:
    page.go_to("BH-2")
    mark = page.box(".plan-cursor")
    page.page.click("#close-boring")
    page.settle()
    assert not page.page.locator("#boring").is_visible()
    page.page.mouse.click(mark["x"] + mark["width"] / 2, mark["y"] + mark["height"] / 2)
    page.settle()
    card = page.text("#boring")
    assert card.startswith("Boring BH-2")
    assert "12+290, 2.5 m right" in card
    assert "water at 1.2 m, rising" in card
    assert "moisture 210%, organic 64%, CBR soaked <2%" in card
    assert "by visual, A-8" in card
    assert "LAB-005" in card
    assert "dark fibrous peat" in card
    assert "confirm with the laboratory" in card


def test_a_click_on_a_boring_in_the_profile_opens_its_card(page: Opened) -> None:
    page.point(boring_pixel(page, float(BORING_DISTANCE_M[2])), 0.45)
    assert "over-boring" in (page.page.get_attribute("#profile", "class") or "")
    page.page.mouse.down()
    page.page.mouse.up()
    page.settle()
    assert page.text("#boring").startswith("Boring BH-3")
    assert "not determined" in page.text("#boring")
    assert "fines_pct is missing" in page.text("#boring")


def test_a_boring_left_out_says_why(page: Opened) -> None:
    page.go_to("BH-4")
    assert "Left out: 118 m from the alignment, farther than half_width_m 75" in page.text("#boring")
    assert "No samples and no layers of it were read" in page.text("#boring")


def test_the_samples_of_a_boring_left_out_are_shown(open_page: Open, written: Write, results: Results) -> None:
    samples = results.tables["samples"].copy()
    samples.loc[samples.index[-1], ["boring", "status", "reason"]] = ["BH-4", "left out", "its boring is left out"]
    page = open_page(written(dataclasses.replace(results, tables={**results.tables, "samples": samples})))
    page.go_to("BH-4")
    assert "What was read of it is shown below" in page.text("#boring")
    assert str(samples["sample"].iloc[-1]) in page.text("#boring")
    assert "left out: its boring is left out" in page.text("#boring")


def test_go_to_finds_every_chainage_across_the_equation(page: Opened) -> None:
    for distance in (0.0, 7.5, 299.9, 300.0, 451.5, 600.0):
        page.go_to(chainage(distance))
        assert page.distance == pytest.approx(distance, abs=0.06)
        assert page.text("#stretch h2") == f"Chainage {chainage(distance)}"


def test_go_to_answers_what_does_not_exist(page: Opened) -> None:
    page.go_to("14+000")
    assert "No such chainage or boring" in page.text("#go-to-answer")
    assert "12+000 to 12+650" in page.text("#go-to-answer")
    page.go_to("12+325")  # swallowed by the equation: 12+300 is followed by 12+350
    assert page.text("#go-to-answer") == "There is no such chainage: the equation 12+300 = 12+350 skips it."
    page.go_to("12+360")
    assert page.text("#go-to-answer") == ""


@pytest.mark.parametrize("typed", ["bh2", "BH 02", "bh-002", "Bh_2"])
def test_go_to_finds_a_boring_as_people_type_it(page: Opened, typed: str) -> None:
    page.go_to(typed)
    assert page.text("#boring-title") == "Boring BH-2"


def test_go_to_asks_where_a_name_fits_two_borings(open_page: Open, written: Write) -> None:
    page = open_page(written(sample_results(first="bh 02")))
    page.go_to("BH2")
    assert page.text("#go-to-answer") == "Several borings are named so: bh 02, BH-2."
    page.go_to("BH-2")  # as it is written, there is only one
    assert page.text("#boring-title") == "Boring BH-2"


def test_a_chainage_that_stands_twice_is_said(open_page: Open, written: Write, results: Results) -> None:
    overlap = dataclasses.replace(results, chainage_breaks=((0.0, 0.0), (300.0, 200.0)))
    page = open_page(written(overlap))
    page.go_to("0+250")
    assert page.distance == pytest.approx(250.0)
    assert "stands 2 times" in page.text("#go-to-answer")


def test_the_colors_change_with_their_legend(page: Opened) -> None:
    seen = {}
    for color in ("group", "suitability", "unsuitable", "evidence"):
        page.page.select_option("#color-by", color)
        page.settle()
        seen[color] = page.text("#legend")
    assert "PT peat" in seen["group"]
    assert "less sure" in seen["group"]
    assert seen["suitability"] == "suitable treat unsuitable not assessed"
    assert seen["unsuitable"].startswith("below 10%")
    assert seen["evidence"] == "observed inferred no data"


def test_the_keyboard_alone_reads_the_line(page: Opened) -> None:
    for _ in range(30):
        page.page.keyboard.press("Tab")
        if page.page.evaluate("document.activeElement.id") == "profile":
            break
    assert page.page.evaluate("document.activeElement.id") == "profile"
    assert page.page.evaluate("getComputedStyle(document.activeElement).outlineStyle") == "solid"
    page.press("Home")
    assert page.distance == 0
    page.press("ArrowRight")
    assert page.distance == pytest.approx(1.5 * STEP_M)
    page.press("Shift+ArrowRight")
    assert page.distance == pytest.approx(11.5 * STEP_M)
    spoken = page.page.get_attribute("#profile", "aria-valuetext") or ""
    assert spoken.startswith(f"Chainage {chainage(115.0)}, ")
    page.press("PageDown")
    assert page.text("#boring").startswith("Boring BH-2")
    page.press("Escape")
    assert page.on_plan is None
    assert not page.page.locator("#boring").is_visible()


def test_wheel_zooms_and_drag_moves_the_profile(page: Opened) -> None:
    def span() -> tuple[float, float]:
        page.point(0.2)
        left = page.distance
        page.point(0.8)
        return left, page.distance

    left, right = span()
    page.point(0.5)
    page.page.mouse.wheel(0, -240)
    page.settle()
    closer = span()
    assert closer[1] - closer[0] < 0.9 * (right - left)
    box = page.box("#profile")
    page.point(0.5)
    page.page.mouse.down()
    page.page.mouse.move(box["x"] + 0.4 * box["width"], box["y"] + 60, steps=4)
    page.page.mouse.up()
    page.settle()
    moved = span()
    assert moved[0] > closer[0] + 1
    assert moved[1] - moved[0] == pytest.approx(closer[1] - closer[0], abs=0.3)
    page.page.click("#zoom-all")
    page.settle()
    assert span() == pytest.approx((left, right), abs=0.1)


def test_depth_below_ground_can_be_the_vertical_axis(page: Opened) -> None:
    before = page.text("#exaggeration")
    page.page.select_option("#vertical", "depth")
    page.settle()
    assert page.text("#exaggeration").startswith("Vertical exaggeration ")
    assert page.text("#exaggeration") != before


def test_findings_filter_by_severity(page: Opened) -> None:
    page.page.locator("#findings summary").click()
    rows = page.page.locator("#findings-rows tr")
    assert rows.count() == 3
    page.page.select_option("#findings-severity", "error")
    assert rows.count() == 1
    assert "118 m" in rows.first.inner_text()
    assert "75 m or nearer" in rows.first.inner_text()


def test_a_finding_opens_its_boring(page: Opened) -> None:
    page.page.locator("#findings summary").click()
    page.page.get_by_role("button", name="BH-4", exact=True).first.click()
    page.settle()
    assert page.text("#boring-title") == "Boring BH-4"
    assert page.box("#boring")["y"] < WIDTHS[1440]


def test_the_shares_of_a_step_add_up_to_a_hundred(page: Opened) -> None:
    for distance in range(5, STEPS * int(STEP_M), 70):
        page.go_to(chainage(distance))
        lists = page.page.locator("#stretch .share-list")
        for k in range(lists.count()):
            shares = [int(text.rstrip("%")) for text in lists.nth(k).locator("b").all_inner_texts()]
            assert sum(shares) == 100


def test_the_limits_of_the_verdicts_stand_beside_their_legend(
    open_page: Open, written: Write, results: Results
) -> None:
    said = "unsuitable from probability 0.5; suitable only where unsuitable is below 0.1"
    run = results.tables["run"]
    run = pd.concat([run[run["key"] != "verdict limits"], pd.DataFrame({"key": ["verdict limits"], "value": [said]})])
    page = open_page(written(dataclasses.replace(results, tables={**results.tables, "run": run})))
    assert said not in page.text("#legend")
    page.page.select_option("#color-by", "suitability")
    assert said in page.text("#legend")
    page.page.emulate_media(media="print")
    assert said in page.text("#statement")


def test_lengths_are_in_feet_where_the_corridor_is(open_page: Open, written: Write) -> None:
    page = open_page(written(sample_results(length_unit="ft")))
    assert page.text("#length") == "1,969 ft"  # 600 / 0.3048
    page.go_to("BH-2")
    assert "14.8 ft" in page.text("#boring")  # 4.5 / 0.3048


def test_without_a_formation_the_page_shows_groups_by_depth(open_page: Open, written: Write, results: Results) -> None:
    judged = ["formation_level_m", "cut_fill_m", "subgrade_material", "suitability", "soil_group", "probability"]
    judged += ["p_suitable", "p_treat", "p_unsuitable", "p_not_assessed"]
    steps = schema.conform(results.tables["subgrade"].drop(columns=judged), schema.layers()["subgrade"])
    ground = results.tables["ground"].assign(formation_level_m=np.nan)
    bare = dataclasses.replace(results, tables={**results.tables, "subgrade": steps, "ground": ground})
    page = open_page(written(bare))
    page.point(0.5)
    assert "No formation was given" in page.text("#lengths")
    assert "CL" in page.text("#legend")
    assert "formation" not in page.text("#line-keys")
    assert "Soil group" in page.text("#stretch")
    assert page.complaints == []


def test_a_formation_without_ground_levels_is_not_called_missing(
    open_page: Open, written: Write, results: Results
) -> None:
    """The run then has no formation level at any step, and draws the ground at 0."""
    judged = ["formation_level_m", "cut_fill_m", "subgrade_material"]
    steps = schema.conform(results.tables["subgrade"].drop(columns=judged), schema.layers()["subgrade"])
    ground = results.tables["ground"].assign(formation_level_m=np.nan, ground_level_m=0.0)
    counts = pd.DataFrame({"table": ["formation"], "read": [60], "used": [60], "left_out": [0]})
    run = pd.DataFrame({"key": ["ground levels"], "value": ["ground not known: nobody gave a level"]})
    replaced = {
        "subgrade": steps,
        "ground": ground,
        "counts": pd.concat([results.tables["counts"].query("table != 'formation'"), counts]),
        "run": pd.concat([results.tables["run"].query("key != 'ground levels'"), run]),
    }
    page = open_page(written(dataclasses.replace(results, tables={**results.tables, **replaced})))
    said = page.text("#lengths")
    assert "A formation was given" in said
    assert "ground not known: nobody gave a level" in said
    page.point(0.5)
    assert "Ground level not known" in page.text("#stretch")
    assert page.page.input_value("#vertical") == "depth"
    assert page.complaints == []


@pytest.mark.parametrize("kind", HOSTILE)
def test_hostile_names_are_shown_and_do_nothing(
    open_page: Open, written: Write, benign_globals: str, kind: str
) -> None:
    name = HOSTILE[kind]
    page = open_page(written(sample_results(name=name, first=name)))
    page.press("PageDown")
    page.point(0.3)
    page.point(0.15)
    assert page.page.locator("#boring-title b").text_content() == name
    assert page.page.locator("#corridor-name").text_content() == name
    assert page.dialogs == []
    assert page.requests == []
    assert page.complaints == []
    assert page.page.evaluate(GLOBALS) == benign_globals
    assert page.page.evaluate("document.documentElement.scrollWidth") <= 1440
    header, plan = page.box(".title-block"), page.box(".plan")
    assert header["height"] < 200
    assert plan["height"] > 150
    page.shot(f"hostile_{kind}")


def test_a_finger_moves_the_profile_and_opens_a_place(open_page: Open, large: Path) -> None:
    page = open_page(large, 390, has_touch=True, is_mobile=True)
    page.page.locator("#profile").scroll_into_view_if_needed()
    assert "of 8.00 km: drag for more" in page.text("#part")
    assert float(page.text("#exaggeration").split()[-1]) <= 100
    page.page.click("#zoom-all")
    page.settle()
    assert not page.page.locator("#part").is_visible()
    box = page.box("#profile")
    page.page.touchscreen.tap(box["x"] + 0.5 * box["width"], box["y"] + 0.3 * box["height"])
    page.settle()
    assert 3000 < page.distance < 6000
    assert page.page.locator("#stretch").is_visible()


def ink(pdf: Path, sheet: int, top: float, bottom: float) -> float:
    """Return the share of pixels between two heights of a printed sheet that are neither white nor gray."""
    picture = pdf.with_suffix("")
    page = ["-f", str(sheet), "-l", str(sheet), "-singlefile"]
    subprocess.run(["pdftoppm", "-r", "40", *page, str(pdf), str(picture)], check=True)
    raw = picture.with_suffix(".ppm").read_bytes()
    magic, width, height, _, pixels = raw.split(maxsplit=4) if raw[:2] == b"P6" else (b"", b"", b"", b"", b"")
    assert magic == b"P6"
    size = int(width) * int(height) * 3
    colors = np.frombuffer(pixels[-size:], dtype=np.uint8).reshape(int(height), int(width), 3).astype(int)
    part = colors[int(top * len(colors)) : int(bottom * len(colors))]
    return float((part.max(axis=2) - part.min(axis=2) > 40).mean())


PAPERS = {
    "as_the_page_asks": {"prefer_css_page_size": True},
    "a4": {"format": "A4"},
    "a3": {"format": "A3", "landscape": True},
}


@pytest.mark.skipif(shutil.which("pdftoppm") is None, reason="no pdftoppm on this machine")
@pytest.mark.parametrize("paper", PAPERS)
def test_the_printed_sheet_holds_plan_and_profile(open_page: Open, large: Path, tmp_path: Path, paper: str) -> None:
    """The soil colors are looked for where the profile stands: canvases can be lost on the way to paper."""
    page = open_page(large)
    page.page.select_option("#color-by", "group")
    page.settle()
    pdf = tmp_path / "sheet.pdf"
    page.page.pdf(path=pdf, print_background=True, **PAPERS[paper])
    assert ink(pdf, 1, 0.62, 0.85) > 0.15  # the section
    assert ink(pdf, 1, 0.3, 0.5) > 0.002  # the line on the plan
    assert ink(pdf, 2, 0.5, 1.0) < 0.01  # findings, not the rest of the profile
    assert page.complaints == []
    page.point(0.5)  # and the screen is as it was
    assert page.page.locator("#stretch").is_visible()
    assert page.page.evaluate("document.getElementById('cards').parentElement.className") == "workspace"


def test_the_printed_sheet_keeps_the_drawings_and_drops_the_tools(open_page: Open, large: Path) -> None:
    page = open_page(large)
    page.page.emulate_media(media="print")
    page.settle()
    sheet, profile = page.box(".sheet"), page.box(".profile")
    assert profile["y"] + profile["height"] <= sheet["y"] + sheet["height"]
    assert page.box(".plan")["height"] > 250
    assert page.page.locator("#cautions").is_visible()
    assert not page.page.locator("#go-to").is_visible()
    page.shot("print")
    page.page.emulate_media(media="screen")
    page.settle()
    assert page.page.locator("#go-to").is_visible()


def test_an_open_card_is_printed_after_the_sheet(open_page: Open, large: Path) -> None:
    page = open_page(large)
    page.go_to("BH-12")
    page.page.emulate_media(media="print")
    page.settle()
    assert page.page.locator("#boring").is_visible()
    assert page.box("#boring")["y"] >= page.box(".sheet")["y"] + page.box(".sheet")["height"]


@pytest.mark.parametrize("width", [1440, 1024])
def test_the_grid_reaches_the_frame_of_a_wide_plan(open_page: Open, written: Write, width: int) -> None:
    """A corridor that runs north fills little of the width; values of northing stand at the left edge."""
    page = open_page(written(northward()), width)
    assert page.page.locator(".grid-N").count() >= 3
    frame = page.box(".plan")
    at = sorted(place["x"] for place in (label.bounding_box() for label in page.page.locator(".grid-E").all()))
    steps = np.diff(at)
    assert at[0] - frame["x"] < 60 + steps.max()
    assert frame["x"] + frame["width"] - at[-1] < 100 + steps.max()


@pytest.mark.parametrize("width", [1440, 1024])
def test_the_bar_of_the_profile_stays_in_one_row(open_page: Open, large: Path, width: int) -> None:
    page = open_page(large, width)
    assert page.box(".profile .bar")["height"] < 45
    assert (
        page.page.evaluate(
            "(({ scrollWidth, clientWidth }) => scrollWidth - clientWidth)(document.querySelector('.profile .bar'))"
        )
        <= 0
    )


def northward() -> Results:
    """The constructed corridor, turned to run north."""
    results = large_results()
    tables = {
        name: table.assign(geometry=[None if g is None else turned(g) for g in table["geometry"]])
        for name, table in results.tables.items()
        if "geometry" in table.columns
    }
    return dataclasses.replace(results, tables={**results.tables, **tables})


def turned(shape: shapely.Geometry) -> shapely.Geometry:
    """Return a shape with its eastings and northings about the start of the line exchanged."""
    start = np.array([431_000.0, 5_623_000.0])
    return shapely.transform(shape, lambda xy: start + (xy - start)[:, ::-1])
