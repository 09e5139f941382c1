"""The first half of the job: the input read, placed, classified and judged, with a finding for whatever is odd."""

from __future__ import annotations

from collections.abc import Callable, Iterable
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap import inputs, intake
from geomap.alignment.along import Along, Drawing, levels_along
from geomap.alignment.chainage import Chainage
from geomap.alignment.line import Line
from geomap.alignment.placing import place_borings
from geomap.ground import records
from geomap.inputs import Job
from geomap.profile.cells import step_edges
from geomap.ratings import rules
from geomap.soils.properties import describe
from geomap.tables import schema
from geomap.tables.findings import Check, together

NO_BORING = Check(
    "no boring to work with",
    "block",
    "at least one boring on the corridor",
    "settle the findings about borings, if there are any, or fill in the table",
)

Tell = Callable[[str], None]


def silent(stage: str) -> None:
    """Say nothing about the stage at work."""


@dataclass(frozen=True)
class Gate:
    """The input, read and judged.

    Attributes
    ----------
    placed
        Places of the borings on the line.
    judged
        Soils with properties, classes and verdicts: the samples used, then the logged layers (``is_layer``).
    levels
        Levels at the center of each step, `edges` being the borders of the steps [m].
    findings, counts
        Queries, and rows read, used and left out by table.
    """

    job: Job
    line: Line
    chainage: Chainage
    taken: intake.Intake
    placed: pd.DataFrame
    judged: pd.DataFrame
    edges: NDArray[np.float64]
    levels: Along
    findings: pd.DataFrame
    counts: pd.DataFrame

    def located(self, table: pd.DataFrame) -> pd.DataFrame:
        """Return `table` with place and depth of the boring of each row."""
        holes = self.taken.used("borings").drop(columns=["x", "y"]).join(self.placed)
        places = holes.set_index("boring")[["distance_m", "offset_m", "depth_m"]]
        return table.join(places.rename(columns={"depth_m": "hole_depth_m"}), on="boring")


def check(path: str | Path, tell: Tell = silent) -> Gate:
    """Read and judge the input of a corridor; nothing is written.

    Raises
    ------
    UsageError
        The corridor file is wrong.
    InputError
        A file cannot be used at all.
    """
    job = inputs.prepare(path)
    corridor, half_width = job.corridor, job.corridor.corridor.half_width_m
    tell("reading")
    line, chainage, of_line = inputs.read_line(job)
    tables = inputs.read_tables(job)
    tell("checking")
    taken = intake.screen(intake.accept(raw for name in tables if name not in inputs.LEVELS for raw in tables[name]))
    systems = inputs.coordinate_systems(job, tables)
    placed, of_crs = place_borings(line, job.crs, taken.used("borings"), systems, half_width)
    taken = intake.place(taken, placed, half_width)
    given = {name: intake.screen(intake.accept(tables[name])) for name in inputs.LEVELS if name in tables}
    edges = step_edges(line.length_m, corridor.profile.step_m)
    design = corridor.formation
    levels = levels_along(
        (edges[:-1] + edges[1:]) / 2,
        {name: (", ".join(corridor.tables()[name].files), part.used("levels")) for name, part in given.items()},
        taken.used("borings").join(placed["distance_m"]),
        chainage,
        Drawing(design.reference, design.construction_thickness_m, design.pipe_diameter_m) if design else None,
        corridor.subgrade.width_m,
    )
    tell("classifying")
    judged = judge(taken, job)
    if "uscs_symbol" in judged:
        taken = intake.agree(taken, judged, judged)
    odd_levels = _as_written(levels.findings, given.values())
    if not len(taken.used("borings")):
        of_crs = together([of_crs, NO_BORING.row("", "no boring of use", file=", ".join(corridor.borings.files))])
    found = together([of_line, taken.findings, of_crs, *(part.findings for part in given.values()), odd_levels])
    counts = pd.concat([taken.counts(), *(part.counts().assign(table=name) for name, part in given.items())])
    return Gate(job, line, chainage, taken, placed, judged, edges, levels, found, counts.reset_index(drop=True))


def _as_written(findings: pd.DataFrame, tables: Iterable[intake.Intake]) -> pd.DataFrame:
    """Return findings about levels under the headings of their files; a place is told by distance or chainage."""
    heading = findings["heading"]
    for (file, _), found in (item for table in tables for item in table["levels"].headings.items()):
        place = found.get("distance_m") or found.get("chainage", "")
        words = {"distance_m": place, "chainage": place, **found}
        heading = heading.mask(findings["file"] == file, heading.replace(words))
    return findings.assign(heading=heading)


def logged(taken: intake.Intake) -> pd.DataFrame:
    """Return the logged layers that are used; an empty table where the corridor has none."""
    if "strata" in taken:
        return taken.used("strata")
    return schema.conform(pd.DataFrame(), schema.inputs()["strata"], schema.SOURCE_COLUMNS)


def judge(taken: intake.Intake, job: Job) -> pd.DataFrame:
    """Classify and rate every soil: the samples used, then the logged layers. This is the only judge."""
    part = job.corridor.samples
    strata = logged(taken)
    samples = records.with_log(taken.used("samples"), strata)
    layers = records.layer_rows(strata, samples, first=len(taken.rows("samples")))
    gradations = taken.used("gradations")
    described = describe(samples, gradations, part.join_tolerance_m, organic_limit_pct=part.peat_organic_pct)
    alone = describe(layers, gradations.iloc[:0], None)
    alone["specimen"] += len(described)
    properties = pd.concat([described, alone.astype(described.dtypes)])
    soils = pd.concat([samples.assign(is_layer=False), layers.assign(is_layer=True)])
    said = ["origin", "unit"]  # what one row of a specimen says holds for all of it
    soils[said] = soils[said].groupby(properties["specimen"]).transform("first")
    classes = [system.classify(properties) for system in job.judging]
    derived = pd.concat([properties, *classes], axis=1)
    known = soils.drop(columns=derived.columns, errors="ignore").join(derived)
    categories = known.select_dtypes("category").columns
    known[categories] = known[categories].astype("string")
    return known.join(rules.rate(known, job.rule_sets))
