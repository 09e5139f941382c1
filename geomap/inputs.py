"""From a corridor file to its input as read: everything it names is found before any work starts."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

import numpy as np
import pandas as pd
from pyproj import CRS

from geomap import catalog, registry
from geomap.alignment import crs, placing
from geomap.alignment.chainage import Chainage, chainage_from_settings
from geomap.alignment.line import Line, line_from_vertices
from geomap.corridor import Corridor, read_corridor
from geomap.ratings.rules import RuleSet, read_rule_set
from geomap.readers import alignments, borings, surfaces
from geomap.readers.options import TableOptions
from geomap.soils.systems import SYSTEMS, System
from geomap.tables.findings import Check, together
from geomap.tables.raw import RawTable

ODD_PLACE = Check(
    "place of the line",
    "query",
    "a line inside the area of its coordinate system",
    "used as it is; check the crs of the corridor and that x is easting and y northing",
)
NO_RECORDS = pd.DataFrame({"passing_0_075_mm_pct": np.zeros(0)})  # to see which columns a system gives
LEVELS = ("ground", "formation")  # sections whose tables are levels along the line


@dataclass(frozen=True)
class Job:
    """A corridor file, with everything that it names found.

    Attributes
    ----------
    systems
        Those that the corridor asks for, the leading one first.
    judging
        The same, and those whose classes the rule sets look at.
    """

    corridor: Corridor
    crs: CRS
    systems: tuple[System, ...]
    judging: tuple[System, ...]
    rule_sets: tuple[RuleSet, ...]

    def place(self, section: str, key: str) -> str:
        """Return where a key stands, for a message."""
        return f"{self.corridor.path.name}: [{section}] {key}"


def prepare(path: str | Path) -> Job:
    """Read the corridor file and find all that it names: systems, rule sets, products, files, coordinate systems.

    Raises
    ------
    UsageError
        Something is not known, with what there is.
    """
    corridor = read_corridor(path, catalog.choices())
    place = corridor.path.name
    systems = tuple(registry.named(SYSTEMS, name, place) for name in corridor.profile.systems)
    symbols = {system.COLUMN: system.SYMBOLS for system in SYSTEMS}
    rule_sets = tuple(read_rule_set(name, corridor.folder, symbols=symbols) for name in corridor.subgrade.rules)
    asked = {column for rule_set in rule_sets for column in rule_set.columns}
    further = tuple(s for s in SYSTEMS if s not in systems and asked & set(s.classify(NO_RECORDS).columns))
    grid = crs.projected_crs(corridor.corridor.crs, f"{place}: [corridor] crs")
    job = Job(corridor, grid, systems, systems + further, rule_sets)
    for section, part in corridor.tables().items():
        for name in part.files:
            registry.for_file(_family(section), Path(name), job.place(section, "file"))
        if part.crs:
            crs.any_crs(part.crs, job.place(section, "crs"))
    registry.for_file(alignments.FORMATS, Path(corridor.alignment.file), job.place("alignment", "file"))
    return job


def _family(section: str) -> tuple[borings.TableFormat, ...]:
    return surfaces.FORMATS if section in LEVELS else borings.FORMATS


def read_line(job: Job) -> tuple[Line, Chainage, pd.DataFrame]:
    """Read the alignment: the line in the corridor's system, its chainage, and what its reader noticed."""
    about, part = job.corridor.corridor, job.corridor.alignment
    path = job.corridor.folder / part.file
    options = TableOptions(sheet=part.sheet, columns=part.columns, length_unit=about.length_unit)
    raw = registry.for_file(alignments.FORMATS, path, job.place("alignment", "file")).read(path, options)
    named = part.crs or raw.crs
    own = crs.any_crs(named, job.place("alignment", "crs")) if named else job.crs
    vertices = placing.vertices_in(raw.vertices, own, job.crs)
    line = line_from_vertices(vertices, part.grid_to_ground, crs.unit_m(job.crs), raw.file)
    pairs = [(equation.back, equation.ahead) for equation in part.equations]
    labels = chainage_from_settings(part.start_chainage, pairs, about.chainage_format, about.length_unit, line.length_m)
    x, y = vertices[:, 0], vertices[:, 1]
    notes = [crs.area_note(x, y, job.crs), crs.scale_note(x, y, job.crs, part.grid_to_ground)]
    odd = [ODD_PLACE.row("crs", note, file=job.corridor.path.name) for note in notes if note]
    return line, labels, together([raw.findings, *odd])


def read_tables(job: Job) -> dict[str, list[RawTable]]:
    """Read every input table, by section of the corridor file."""
    tables: dict[str, list[RawTable]] = {}
    for section, part in job.corridor.tables().items():
        options = TableOptions(sheet=part.sheet, columns=part.columns, length_unit=job.corridor.corridor.length_unit)
        layout = "levels" if section in LEVELS else section
        for name in part.files:
            path = job.corridor.folder / name
            form = registry.for_file(_family(section), path, job.place(section, "file"))
            tables.setdefault(section, []).append(form.read(path, layout, options))
    return tables


def coordinate_systems(job: Job, tables: Mapping[str, list[RawTable]]) -> dict[str, str]:
    """Return the coordinate system of each borings file that has one of its own, stated by the user or by the file."""
    stated = job.corridor.borings.crs
    return {raw.file: stated or raw.crs for raw in tables["borings"] if stated or raw.crs}


def fingerprints(job: Job) -> dict[str, str]:
    """Return the SHA-256 of the corridor file and of every input file, by name relative to the corridor."""
    folder = job.corridor.folder
    found = {}
    for path in job.corridor.files():
        with path.open("rb") as file:
            found[path.relative_to(folder).as_posix()] = hashlib.file_digest(file, "sha256").hexdigest()
    return found
