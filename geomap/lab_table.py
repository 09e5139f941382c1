"""A table of laboratory results classified on its own: the same rows in the same order, with the classes added."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path

import pandas as pd

from geomap import intake, registry
from geomap.errors import InputError, problem
from geomap.exports import table_files
from geomap.readers import borings
from geomap.readers.options import TableOptions
from geomap.soils.classification import ASTM_AND_AASHTO, classify_samples
from geomap.soils.systems import SYSTEMS
from geomap.tables.findings import Check, together
from geomap.tables.raw import RawTable

SHEET = "samples"  # name of the sheet or layer that is written
RENAMED = Check(
    "heading renamed", "convert", "in this format, headings that differ in more than case, other than fid and geom", ""
)


@dataclass(frozen=True)
class Done:
    """What was done: rows written, rows with a class by system, and the findings."""

    rows: int
    classified: dict[str, int]
    findings: pd.DataFrame


def classify_file(table: Path, target: Path, systems: Sequence[str], sheet: str, tell: Callable[[str], None]) -> Done:
    """Classify the table in a file and write it, with the classes, to another.

    Each row is a specimen of its own. The columns of the user are written back as found; where one of them is
    called like a column of geomap, whatever the case of its letters, ours gets ``_geomap`` at its end, and a number
    where that is taken too. A heading that the format cannot take is written under another, and a finding says so.

    Parameters
    ----------
    table, target
        Files; the ending of `target` decides its format.
    systems
        Names of classification systems; empty for ASTM D2487 and AASHTO M 145.
    sheet
        Sheet or layer, where there are several.
    tell
        Called with the stage at work.

    Raises
    ------
    UsageError
        An ending or a system is not known.
    InputError
        The table cannot be used.
    OutputInUseError
        The target cannot be written.
    """
    table_files.check_ending(target)
    chosen = [registry.named(SYSTEMS, name, "--system") for name in dict.fromkeys(systems or ASTM_AND_AASHTO)]
    form = registry.for_file(borings.FORMATS, table, str(table))
    if table.resolve() == target.resolve():
        raise InputError(problem(str(target), "the table itself", "another file", "geomap does not rewrite your files"))
    tell("reading")
    raw = form.read(table, "lab_results", TableOptions(sheet=sheet))
    tell("checking")
    taken = intake.screen(intake.accept([dataclasses.replace(raw, layout="samples")]), intake.SOIL_CHECKS)
    samples = taken.rows("samples")
    tell("classifying")
    names = [system.NAME for system in chosen]
    classes = classify_samples(samples, names, gradations=taken.used("gradations"))
    counts = {system.NAME: int(classes[system.COLUMN].notna().sum()) for system in chosen}
    texts = classes.select_dtypes("category").columns
    classes[texts] = classes[texts].astype("string")
    classes = classes.set_axis(raw.original.index)
    found = [str(heading) for heading in raw.original.columns]
    classes.columns = pd.Index(table_files.free_names([str(name) for name in classes.columns], found, "_geomap"))
    tell("writing")
    renamed = table_files.save(pd.concat([raw.original, classes], axis=1), target, SHEET)
    notes = [_note(raw, heading, name) for heading, name in renamed.items()]
    return Done(len(raw.original), counts, together([taken.findings, *notes]))


def _note(raw: RawTable, heading: str, written: str) -> pd.DataFrame:
    return dataclasses.replace(RENAMED, advice=f"written as {written}").row(
        heading, heading, file=raw.file, sheet=raw.sheet
    )
