"""The corridor file: what it accepts, and what it says when it does not."""

from __future__ import annotations

import tomllib
from pathlib import Path

import pytest

from geomap import catalog
from geomap.corridor import Corridor, read_corridor
from geomap.corridor_text import model_at, template
from geomap.errors import UsageError
from geomap.soils.systems import astm_d2487

CHOICES = {
    "systems": ["astm_d2487", "aashto_m145", "usda_texture"],
    "rules": ["general_subgrade"],
    "products": ["geopackage", "web_map", "schedules"],
    "groups": ["GW", "GM", "GW-GM", "SM", "CL"],
}
GOOD = """\
[corridor]
name = "Test line"
crs = "EPSG:32633"
[alignment]
file = "line.csv"
[borings]
file = "borings.csv"
[samples]
file = "samples.csv"
"""


def corridor_in(folder: Path, text: str) -> Corridor:
    for name in ("line.csv", "borings.csv", "samples.csv"):
        (folder / name).write_text("x")
    (folder / "corridor.toml").write_text(text, encoding="utf-8")
    return read_corridor(folder, CHOICES)


def refusal(folder: Path, text: str) -> str:
    with pytest.raises(UsageError) as caught:
        corridor_in(folder, text)
    return str(caught.value)


def test_defaults_fill_what_is_not_said(tmp_path: Path) -> None:
    corridor = corridor_in(tmp_path, GOOD)
    assert corridor.corridor.half_width_m == 75
    assert corridor.subgrade.rules == ["general_subgrade"]
    assert corridor.profile.systems == ["astm_d2487", "aashto_m145"]
    assert corridor.formation is None
    assert [f.name for f in corridor.files()] == ["corridor.toml", "line.csv", "borings.csv", "samples.csv"]


def test_a_folder_or_the_file_itself_may_be_named(tmp_path: Path) -> None:
    corridor = corridor_in(tmp_path, GOOD)
    assert read_corridor(tmp_path / "corridor.toml", CHOICES) == corridor


@pytest.mark.parametrize(
    ("changed", "to", "line", "words"),
    [
        ("crs =", "crz =", 3, "did you mean crs?"),
        ('crs = "EPSG:32633"', 'crs = "EPSG:32633"\nhalf_width = 50', 4, "did you mean half_width_m?"),
        ("[samples]", "[sampels]", 8, "did you mean samples?"),
        ('name = "Test line"', "name = 3", 2, "[corridor] name: found '3'"),
        ('name = "Test line"', 'name = ""', 2, "at least 1 character"),
        ('file = "samples.csv"', 'file = "sample.csv"', 9, "a file that exists"),
        ('file = "samples.csv"', 'file = "../samples.csv"', 9, "inside the folder"),
        ('file = "samples.csv"', "file = 3", 9, "a file name or a list of them"),
        ('file = "samples.csv"', 'file = "samples.csv"\n[profile]\nstep_m = -1', 11, "greater than or equal to 0.1"),
        (
            'file = "samples.csv"',
            'file = "samples.csv"\n[profile]\nsystems = ["astm_d2478"]',
            11,
            "did you mean astm_d2487?",
        ),
        ('file = "samples.csv"', 'file = "samples.csv"\n[subgrade]\nrules = ["x.toml"]', 11, "general_subgrade"),
        ('file = "samples.csv"', 'file = "samples.csv"\n[outputs]\nproducts = ["pdf"]', 11, "geopackage"),
        (
            'file = "samples.csv"',
            'file = "samples.csv"\n[samples.columns]\nliquid_limt_pct = "a"',
            11,
            "liquid_limit_pct?",
        ),
        ('file = "samples.csv"', 'file = "samples.csv"\n[formation]\nfile = "line.csv"', 10, "add `reference`"),
    ],
)
def test_what_is_wrong_is_named_with_its_line(tmp_path: Path, changed: str, to: str, line: int, words: str) -> None:
    text = GOOD.replace(changed, to)
    assert text != GOOD
    message = refusal(tmp_path, text)
    assert any(part.startswith(f"corridor.toml:{line}:") and words in part for part in message.splitlines()), message


def with_key(section: str, key: str, value: str) -> str:
    """Return a good corridor file with one key more, in line 11 or, in a section that it has, further up."""
    if f"[{section}]" in GOOD:
        return GOOD.replace(f"[{section}]", f"[{section}]\n{key} = {value}")
    needs = {"formation": 'file = "line.csv"\nreference = "invert"\n', "fill": 'group = "GM"\n'}
    return f"{GOOD}[{section}]\n{key} = {value}\n{needs.get(section, '')}"


NUMBERS = [
    ("corridor", "half_width_m"),
    ("alignment", "grid_to_ground"),
    ("alignment", "start_chainage"),
    ("samples", "join_tolerance_m"),
    ("samples", "peat_organic_pct"),
    ("formation", "construction_thickness_m"),
    ("formation", "pipe_diameter_m"),
    ("fill", "cbr_pct"),
    ("subgrade", "depth_m"),
    ("subgrade", "width_m"),
    ("subgrade", "side_slope"),
    ("profile", "step_m"),
    ("profile", "thickness_m"),
    ("profile", "depth_m"),
    ("estimation", "realizations"),
    ("estimation", "seed"),
    ("estimation", "horizontal_range_m"),
    ("estimation", "vertical_range_m"),
]


def test_the_list_of_numbers_is_whole() -> None:
    numbers = {
        (section, key)
        for section in Corridor.model_fields
        if section != "path"
        for key, field in model_at(Corridor, (section,)).model_fields.items()
        if {float, int} & {field.annotation, *getattr(field.annotation, "__args__", ())}
    }
    assert numbers == set(NUMBERS)


@pytest.mark.parametrize("value", ["inf", "-inf", "nan", "1e999"])
@pytest.mark.parametrize(("section", "key"), NUMBERS)
def test_a_number_is_finite(section: str, key: str, value: str, tmp_path: Path) -> None:
    message = refusal(tmp_path, with_key(section, key, value))
    assert f"[{section}] {key}: found '" in message
    assert "finite" in message
    assert len(message.splitlines()) == 1


@pytest.mark.parametrize("value", ["inf", "nan"])
def test_a_chainage_equation_is_finite(value: str, tmp_path: Path) -> None:
    message = refusal(tmp_path, with_key("alignment", "equations", f"[{{ back = {value}, ahead = '1+200' }}]"))
    assert f"found '{value}'; allowed: a finite number, or a chainage as text" in message


@pytest.mark.parametrize(
    ("section", "key", "least", "most"),
    [
        ("estimation", "horizontal_range_m", 1, 100_000),
        ("estimation", "vertical_range_m", 0.05, 1000),
        ("profile", "step_m", 0.1, 1000),
    ],
)
def test_a_number_lies_within_its_limits(section: str, key: str, least: float, most: float, tmp_path: Path) -> None:
    for value in (least, most):
        corridor = corridor_in(tmp_path, with_key(section, key, str(value)))
        assert getattr(getattr(corridor, section), key) == value
    for value, words in ((least * 0.99, f"equal to {least}"), (most * 1.01, f"equal to {most}"), (0, "equal to")):
        message = refusal(tmp_path, with_key(section, key, str(value)))
        assert message.startswith(f"corridor.toml:11: [{section}] {key}: found")
        assert words in message


def test_a_cell_is_a_centimeter_thick_at_least(tmp_path: Path) -> None:
    assert corridor_in(tmp_path, with_key("profile", "thickness_m", "0.01")).profile.thickness_m == 0.01
    assert "equal to 0.01" in refusal(tmp_path, with_key("profile", "thickness_m", "0.0099"))


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            "[subgrade]\ndepth_m = 0.5\n[profile]\nstep_m = 20\nthickness_m = 0.6\n",
            (
                "corridor.toml:14: [profile] thickness_m: found '0.6'; allowed: at most 0.5, the value at "
                "corridor.toml:11: [subgrade] depth_m; make the cells thinner or the design zone deeper"
            ),
        ),
        (
            "[profile]\nthickness_m = 1.5\n",
            (
                "corridor.toml:11: [profile] thickness_m: found '1.5'; allowed: at most 1.0, the value at "
                "corridor.toml: [subgrade] depth_m (by default); make the cells thinner or the design zone deeper"
            ),
        ),
        (
            "[subgrade]\ndepth_m = 0.2\n",
            (
                "corridor.toml: [profile] thickness_m (by default): found '0.25'; allowed: at most 0.2, the value at "
                "corridor.toml:11: [subgrade] depth_m; make the cells thinner or the design zone deeper"
            ),
        ),
    ],
)
def test_a_cell_is_no_thicker_than_the_design_zone(text: str, message: str, tmp_path: Path) -> None:
    assert refusal(tmp_path, GOOD + text) == message


def test_a_cell_may_be_as_thick_as_the_design_zone(tmp_path: Path) -> None:
    corridor = corridor_in(tmp_path, GOOD + "[subgrade]\ndepth_m = 0.5\n[profile]\nthickness_m = 0.5\n")
    assert corridor.profile.thickness_m == corridor.subgrade.depth_m


@pytest.mark.parametrize("reference", ["formation", "finished_level", "invert", "crown", "cover", "ground"])
def test_crown_and_cover_need_the_diameter_of_the_pipe(reference: str, tmp_path: Path) -> None:
    text = f'{GOOD}[formation]\nfile = "line.csv"\nreference = "{reference}"\n'
    if reference in ("crown", "cover"):
        assert refusal(tmp_path, text) == (
            f"corridor.toml:12: [formation] reference: found '{reference} without pipe_diameter_m'; allowed: crown and "
            "cover with the outside diameter; add `pipe_diameter_m`"
        )
        text += "pipe_diameter_m = 0.6\n"
    design = corridor_in(tmp_path, text).formation
    assert design is not None
    assert design.reference == reference


@pytest.mark.parametrize(
    ("group", "remedy"),
    [("gm", "did you mean GM?"), ("GWGM", "did you mean GW-GM?"), ("A-2-4", "choose one of these"), ("", "choose one")],
)
def test_the_group_of_the_fill_is_one_that_is_known(group: str, remedy: str, tmp_path: Path) -> None:
    message = refusal(tmp_path, f'{GOOD}[fill]\ngroup = "{group}"\n')
    assert message.startswith(
        f"corridor.toml:11: [fill] group: found '{group}'; allowed: CL, GM, GW, GW-GM, SM; {remedy}"
    )
    fill = corridor_in(tmp_path, f'{GOOD}[fill]\ngroup = "GW-GM"\n').fill
    assert fill is not None
    assert fill.group == "GW-GM"


def test_what_geomap_knows_holds_every_group_of_astm_d2487() -> None:
    assert catalog.choices()["groups"] == list(astm_d2487.SYMBOLS)
    assert {"GM", "CH", "PT", "SW-SC"} <= set(catalog.choices()["groups"])


def test_a_rule_file_of_the_user_is_a_name_too(tmp_path: Path) -> None:
    (tmp_path / "ours.toml").write_text("x = 1", encoding="utf-8")
    rules = '[subgrade]\nrules = ["general_subgrade", "ours.toml"]\n'
    assert corridor_in(tmp_path, GOOD + rules).subgrade.rules == ["general_subgrade", "ours.toml"]
    assert "each name once" in refusal(tmp_path, GOOD + rules.replace("general_subgrade", "ours.toml"))


def test_a_file_in_place_of_the_output_folder_is_refused(tmp_path: Path) -> None:
    (tmp_path / "outputs").write_text("x", encoding="utf-8")
    assert refusal(tmp_path, GOOD).startswith("corridor.toml: [outputs] folder (by default): found 'outputs'")


@pytest.mark.parametrize("use", ["road", "pipeline"])
def test_a_corridor_is_for_a_road_or_a_pipeline(use: str, tmp_path: Path) -> None:
    text = GOOD.replace("[alignment]", f'use = "{use}"\n[alignment]')
    assert corridor_in(tmp_path, text).corridor.use == use
    assert "'road' or 'pipeline'" in refusal(tmp_path, text.replace(f'"{use}"', '"rail"'))


def test_all_problems_are_told_at_once(tmp_path: Path) -> None:
    text = GOOD.replace("crs =", "crz =").replace('name = "Test line"', "name = 3")
    message = refusal(tmp_path, text)
    assert len(message.splitlines()) == 3  # crz is unknown, crs is missing, name is a number


def test_broken_toml_names_the_line(tmp_path: Path) -> None:
    assert "line 2" in refusal(tmp_path, GOOD.replace('name = "Test line"', "name = ="))


def test_a_missing_file_says_what_to_do(tmp_path: Path) -> None:
    with pytest.raises(UsageError, match="geomap new"):
        read_corridor(tmp_path / "nowhere", CHOICES)


def test_a_file_that_is_not_text_is_refused(tmp_path: Path) -> None:
    (tmp_path / "corridor.toml").write_bytes(b"\xff\xfe\x00\x01")
    with pytest.raises(UsageError, match="UTF-8"):
        read_corridor(tmp_path, CHOICES)


def test_the_template_names_every_key_and_is_a_corridor_file(tmp_path: Path) -> None:
    text = template(Corridor)
    for section, field in Corridor.model_fields.items():
        if section != "path":
            assert f"[{section}]" in text
            assert field.description
            assert field.description in text
    parsed = tomllib.loads(
        "\n".join(line.removeprefix("# ") for line in text.splitlines() if "=" in line or "[" in line)
    )
    assert set(parsed) == set(Corridor.model_fields) - {"path"}
    assert corridor_in(tmp_path, text.replace("alignment.csv", "line.csv")).corridor.name == "New corridor"
