"""The corridor file: TOML in, a frozen :class:`Corridor` out. This module alone knows its keys.

A section that geomap gains is declared here and nowhere else; `corridor_text` makes the messages, and the commented
file of ``geomap new``, from the same declarations; `corridor_checks` compares it with the files and names there are.
"""

from __future__ import annotations

import os
import tomllib
from collections.abc import Collection, Mapping
from pathlib import Path
from typing import Literal

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from geomap.corridor_checks import Keys, Written, file_problems, heading_problems, name_problems, order_problems
from geomap.corridor_text import sentence, unknown_key
from geomap.errors import UsageError, problem

FILE_NAME = "corridor.toml"
LAYOUTS = {"alignment": "vertices", "ground": "levels", "formation": "levels"}  # of the other tables: as the section
NEED_A_DIAMETER = ("crown", "cover")


class _Section(BaseModel):
    model_config = ConfigDict(extra="forbid", frozen=True, allow_inf_nan=False)


class About(_Section):
    """Section ``[corridor]``."""

    name: str = Field(min_length=1, description="name of the corridor, on every output", examples=["New corridor"])
    use: Literal["road", "pipeline"] = Field("road", description="road or pipeline")
    crs: str = Field(description="projected; tables may name their own and are transformed", examples=["EPSG:32630"])
    vertical_datum: str = Field("", description="what levels are measured from: a code or free text")
    half_width_m: float = Field(75.0, gt=0, description="borings farther off are reported and left out")
    length_unit: Literal["m", "ft", "us-ft"] = Field(
        "m", description="m, ft or us-ft: for headings that state no unit, and for the outputs people read"
    )
    chainage_format: Literal["0+000", "0+00"] = Field("0+000", description="0+000 (meters) or 0+00 (feet)")
    issue: str = Field("", description="stamped on every output", examples=["A, for review"])


class Equation(_Section):
    """One chainage equation."""

    back: float | str
    ahead: float | str


class _File(_Section):
    file: str | list[str] = Field(description="file, or a list of files", examples=[""])
    sheet: str = Field("", description="sheet of a workbook or layer of a GeoPackage, where there are several")
    crs: str = Field("", description="coordinate system of the file, where it differs from the corridor's")
    columns: dict[str, str] = Field(
        default_factory=dict,
        description="headings that geomap does not know: its column = your heading",
        examples=[{"boring": "Hole ref"}],
    )

    @property
    def files(self) -> list[str]:
        """The file names as a list."""
        return [self.file] if isinstance(self.file, str) else list(self.file)


class Alignment(_File):
    """Section ``[alignment]``."""

    file: str = Field(description="file of the line", examples=["alignment.csv"])
    start_chainage: float | str = Field(0.0, description="chainage at the start of the line")
    equations: list[Equation] = Field(
        default_factory=list,
        description="back is the chainage reached, ahead the one that goes on from there",
        examples=[[{"back": 1200.0, "ahead": 1250.0}]],
    )
    grid_to_ground: float = Field(1.0, gt=0.9, lt=1.1, description="ground distance over grid distance")


class Borings(_File):
    """Section ``[borings]``."""

    file: str | list[str] = Field(description="file, or a list of files", examples=["borings.csv"])


class Samples(_File):
    """Section ``[samples]``."""

    file: str | list[str] = Field(description="file, or a list of files", examples=["samples.csv"])
    join_tolerance_m: float = Field(
        0.15, ge=0, le=2, description="tests of one boring within this depth of each other are one specimen"
    )
    peat_organic_pct: float | None = Field(
        None,
        gt=0,
        le=100,
        description="organic content above which a soil is peat (PT, A-8); absent: by eye only",
        examples=[30.0],
    )


class Gradations(_File):
    """Section ``[gradations]``."""

    file: str | list[str] = Field(description="file, or a list of files", examples=["gradations.csv"])


class Strata(_File):
    """Section ``[strata]``."""

    file: str | list[str] = Field(description="file, or a list of files", examples=["strata.csv"])


class Ground(_File):
    """Section ``[ground]``."""

    file: str | list[str] = Field(description="file, or a list of files", examples=["ground.csv"])


class Formation(_File):
    """Section ``[formation]``."""

    file: str | list[str] = Field(description="file, or a list of files", examples=["formation.csv"])
    reference: Literal["formation", "finished_level", "invert", "crown", "cover", "ground"] = Field(
        description="what the level is: formation, finished_level, invert, crown, cover or ground",
        examples=["formation"],
    )
    construction_thickness_m: float = Field(
        0.0, ge=0, le=10, description="taken off finished_level; bedding for a pipe; topsoil strip for ground"
    )
    pipe_diameter_m: float | None = Field(
        None, gt=0, le=20, description="outside diameter, for crown and cover", examples=[0.6]
    )


class Fill(_Section):
    """Section ``[fill]``."""

    group: str = Field(description="its USCS symbol", examples=["GM"])
    cbr_pct: float | None = Field(
        None, gt=0, le=200, description="its design CBR, kept in the run record", examples=[15.0]
    )


class Subgrade(_Section):
    """Section ``[subgrade]``."""

    rules: list[str] = Field(
        default=["general_subgrade"], min_length=1, description="rule sets by name or file; the worst governs"
    )
    depth_m: float = Field(1.0, gt=0, le=20, description="design zone below formation")
    width_m: float = Field(12.0, gt=0, le=500, description="width of the formation")
    side_slope: float = Field(1.0, ge=0, le=10, description="horizontal to vertical, for removal")


class Profile(_Section):
    """Section ``[profile]``."""

    step_m: float = Field(10.0, ge=0.1, le=1000, description="length of a step")
    thickness_m: float = Field(0.25, ge=0.01, le=10, description="thickness of a cell")
    depth_m: float = Field(6.0, gt=0, le=200, description="depth below ground, at least")
    systems: list[str] = Field(
        default=["astm_d2487", "aashto_m145"],
        min_length=1,
        description="classification systems, the first one leads",
    )


class Estimation(_Section):
    """Section ``[estimation]``."""

    realizations: int = Field(200, ge=20, le=10_000, description="number of draws")
    seed: int = Field(1, ge=0, description="the same seed gives the same draws")
    horizontal_range_m: float | None = Field(
        None, ge=1, le=100_000, description="range along the line; absent: a stated default", examples=[300.0]
    )
    vertical_range_m: float | None = Field(
        None, ge=0.05, le=1000, description="range in depth; absent: a stated default", examples=[2.0]
    )


class Outputs(_Section):
    """Section ``[outputs]``."""

    folder: str = Field("outputs", description="folder for the outputs")
    products: list[str] = Field(
        default=["geopackage", "web_map", "schedules"], min_length=1, description="what to write"
    )


class Corridor(_Section):
    """One corridor file, checked; `path` is the file itself."""

    corridor: About = Field(description="The job")
    alignment: Alignment = Field(description="The line: GeoJSON, GeoPackage, Shapefile, or a table of x, y")
    borings: Borings = Field(description="Borings and trial pits: where they are and how deep")
    samples: Samples = Field(description="Samples: field descriptions and laboratory results by depth")
    gradations: Gradations | None = Field(None, description="Gradation curves, one row for each sieve (optional)")
    strata: Strata | None = Field(
        None,
        description="Layers as logged; soils of one origin or unit never vote for another (optional)",
    )
    ground: Ground | None = Field(
        None, description="Ground levels along the line (optional; absent: from collar levels, and said so)"
    )
    formation: Formation | None = Field(
        None, description="Design levels along the line (optional; absent: soil groups by depth only)"
    )
    fill: Fill | None = Field(
        None, description="Imported material where the design zone lies in embankment (optional; absent: not assessed)"
    )
    subgrade: Subgrade = Field(default_factory=Subgrade, description="How the subgrade is judged")
    profile: Profile = Field(default_factory=Profile, description="The profile along the line")
    estimation: Estimation = Field(default_factory=Estimation, description="Estimation between borings")
    outputs: Outputs = Field(
        default_factory=Outputs, description="Where the outputs go; the only path that may leave this folder"
    )
    path: Path

    @property
    def folder(self) -> Path:
        """Folder of the corridor file."""
        return self.path.parent

    @property
    def output_folder(self) -> Path:
        """Folder for the outputs."""
        return (self.folder / self.outputs.folder).resolve()

    def tables(self) -> dict[str, _File]:
        """Return the sections that name input tables, by section name, in the order of the file."""
        return {name: part for name, part in self if isinstance(part, _File) and name != "alignment"}

    def files(self) -> list[Path]:
        """Return every input file, the corridor file first."""
        names = [n for part in (self.alignment, *self.tables().values()) for n in part.files]
        return [self.path, *(self.folder / n for n in names)]


def read_corridor(path: str | Path, choices: Mapping[str, Collection[str]]) -> Corridor:
    """Read and check a corridor file.

    Parameters
    ----------
    path
        The file, or a folder that holds ``corridor.toml``.
    choices
        The names known here by key: ``systems``, ``rules``, ``products``, and ``groups`` for the imported fill.

    Raises
    ------
    UsageError
        The file is missing or wrong. The text has one line for each problem, with its line number, what was
        found, what is allowed, and the nearest known word.
    """
    given = Path(path)
    is_folder = os.path.isdir(given)  # noqa: PTH112 - a name that is too long is no folder, and no error
    file = given / FILE_NAME if is_folder else given
    try:
        text = file.read_text("utf-8")
        data = tomllib.loads(text)
    except FileNotFoundError:
        raise UsageError(
            problem(
                str(given),
                f"a folder without {FILE_NAME}" if is_folder else "no such file",
                f"a corridor file or a folder with {FILE_NAME}",
                "try `geomap new FOLDER`",
            )
        ) from None
    except (tomllib.TOMLDecodeError, UnicodeDecodeError) as error:
        raise UsageError(problem(file.name, str(error), "TOML text in UTF-8", "correct the line")) from None
    except OSError as error:
        raise UsageError(problem(str(given), error.strerror or error, "a file that can be read", "check it")) from None
    if "path" in data:
        raise UsageError(unknown_key(file.name, text, ("path",), Corridor))
    try:
        corridor = Corridor(**data, path=file.resolve())
    except ValidationError as error:
        raise UsageError(
            "\n".join(dict.fromkeys(sentence(Corridor, file.name, text, e) for e in error.errors()))
        ) from None
    problems = _problems(corridor, Written(corridor.path, text, data), choices)
    if problems:
        raise UsageError("\n".join(problems))
    return corridor


def _problems(corridor: Corridor, written: Written, choices: Mapping[str, Collection[str]]) -> list[str]:
    parts = {"alignment": corridor.alignment, **corridor.tables()}
    rules, fill = corridor.subgrade.rules, corridor.fill
    own_rules = [name for name in rules if name.endswith(".toml") and (corridor.folder / name).is_file()]
    asked: dict[Keys, list[str]] = {
        ("subgrade", "rules"): rules,
        ("profile", "systems"): corridor.profile.systems,
        ("outputs", "products"): corridor.outputs.products,
        **({("fill", "group"): [fill.group]} if fill else {}),
    }
    known = {**choices, "rules": [*choices["rules"], *own_rules], "group": choices["groups"]}
    thickness = ("profile", "thickness_m"), corridor.profile.thickness_m
    zone = ("subgrade", "depth_m"), corridor.subgrade.depth_m
    return [
        *file_problems(written, {name: part.files for name, part in parts.items()}),
        *_folder_problems(corridor, written),
        *name_problems(written, asked, known),
        *heading_problems(written, LAYOUTS, {name: part.columns for name, part in parts.items()}),
        *order_problems(written, thickness, zone, "make the cells thinner or the design zone deeper"),
        *_pipe_problems(corridor, written),
    ]


def _folder_problems(corridor: Corridor, written: Written) -> list[str]:
    folder = corridor.output_folder
    if not os.path.exists(folder) or os.path.isdir(folder):  # noqa: PTH110, PTH112 - as above
        return []
    return [problem(written.place("outputs", "folder"), corridor.outputs.folder, "a folder", "name another one")]


def _pipe_problems(corridor: Corridor, written: Written) -> list[str]:
    design = corridor.formation
    if design is None or design.reference not in NEED_A_DIAMETER or design.pipe_diameter_m is not None:
        return []
    found, allowed = f"{design.reference} without pipe_diameter_m", "crown and cover with the outside diameter"
    return [problem(written.place("formation", "reference"), found, allowed, "add `pipe_diameter_m`")]
