"""The job, one call for each stage. No engineering happens here: stages judge, this module hands their tables on."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap import layers, registry
from geomap.errors import InputError, UsageError, problem
from geomap.exports import EXPORTS
from geomap.exports.publish import publish, staging
from geomap.gate import Gate, Tell, check, silent
from geomap.geostat.simulation import probability_field
from geomap.ground import records
from geomap.ground.estimate import Estimate, Grid, estimate
from geomap.ground.neighbors import Ranges
from geomap.profile import cells, steps, subgrade
from geomap.profile.verdicts import Scale, zone_draws
from geomap.ratings import rules
from geomap.results import Results

SCALE = Scale(rules.VERDICTS, rules.WORST_FIRST)
NOT_DETERMINED = "n/d"
MOST_CELLS = 5_000_000  # a 100 km corridor in steps of 10 m has 240,000


def run_and_write(path: str | Path, tell: Tell = silent) -> tuple[Results, list[Path]]:
    """Do the whole job and write the outputs; old ones stay until all new ones are complete.

    Raises
    ------
    UsageError, InputError
        As :func:`run`.
    OutputInUseError
        An old output is held by another program, or the folder cannot be written.
    """
    gate = check(path, tell)
    job, results = gate.job, answer(gate, tell)
    tell("writing")
    with staging(job.corridor.output_folder) as folder:
        place = job.place("outputs", "products")
        exports = [registry.named(EXPORTS, name, place) for name in job.corridor.outputs.products]
        staged = [file for export in exports for file in export.write(results, folder)]
        return results, publish(staged, job.corridor.output_folder)


def run(path: str | Path, tell: Tell = silent) -> Results:
    """Do the whole job in memory and return the results; nothing is written.

    Raises
    ------
    UsageError
        The corridor file is wrong.
    InputError
        The input blocks; the text names every finding that does.
    """
    return answer(check(path, tell), tell)


def answer(gate: Gate, tell: Tell = silent) -> Results:
    """Return the results for an input that was read and judged.

    Raises
    ------
    InputError
        The input blocks; the text names every finding that does.
    """
    blocking = gate.findings[gate.findings["action"] == "block"]
    if len(blocking):
        raise InputError("\n".join(layers.sentences(blocking)))
    tell("estimating")
    sheet = lay_out(gate)
    default, given = Ranges(), gate.job.corridor.estimation
    ranges = Ranges(given.horizontal_range_m or default.horizontal, given.vertical_range_m or default.vertical)
    weighed = weigh(gate, sheet, ranges)
    judged = tally(weighed, gate)
    tell("drawing")
    scale = limits(gate)
    fill = imported(gate)
    draws = draw(gate, sheet, ranges, judged, scale, fill)
    holes = gate.located(gate.taken.used("borings")[["boring"]])
    table = steps.step_table(sheet, judged, draws, fill, holes, scale)
    trace_weights = steps.trace_zone(sheet).mean_weights(judged.weights)
    found = layers.Found(
        sheet=sheet,
        ranges=layers.ranges_in_words(ranges, gate.job.corridor),
        steps=table,
        cells=cells.cell_table(sheet, judged.odds, judged.probability, scale, weighed.evidence),
        trace=subgrade.trace_table(trace_weights, weighed.records["specimen"].to_numpy(int), gate.judged),
        draws=draws,
        limits=scale.in_words,
        weights=judged.weights,
        records=weighed.records,
    )
    return layers.results(gate, found, SCALE.words)


def lay_out(gate: Gate) -> cells.Sheet:
    """Lay out the cells of the profile."""
    corridor, along = gate.job.corridor, gate.levels
    levels = cells.Levels(along.ground, along.formation, along.width)
    profile = corridor.profile
    sheet = cells.sheet(gate.edges, levels, profile.thickness_m, profile.depth_m, corridor.subgrade.depth_m)
    if sheet.is_used.size > MOST_CELLS:
        found = f"{sheet.is_used.shape[0]:,} steps of {sheet.is_used.shape[1]:,} cells"
        remedy = "use longer steps or thicker cells, and check the levels"
        raise UsageError(problem(gate.job.place("profile", "step_m"), found, f"{MOST_CELLS:,} cells in all", remedy))
    return sheet


def weigh(gate: Gate, sheet: cells.Sheet, ranges: Ranges) -> Estimate:
    """Weigh the soils for every cell."""
    soils = gate.located(gate.judged)
    specimens, layers_ = records.one_per_specimen(soils[~soils["is_layer"]]), soils[soils["is_layer"]]
    classes = [system.COLUMN for system in gate.job.systems]
    is_answered = specimens[classes].notna().any(axis=1) | (specimens["suitability"] != "not assessed")
    grid = Grid(sheet.centers, sheet.depths, sheet.levels.width / 2)
    return estimate(specimens, layers_, is_answered.to_numpy(bool), grid, ranges)


def tally(weighed: Estimate, gate: Gate) -> steps.Judged:
    """Count symbols, verdicts and rules of the records in every cell."""
    kinds, ensemble = weighed.records, weighed.ensemble
    odds = {}
    for system in gate.job.systems:
        symbols = (NOT_DETERMINED, *system.SYMBOLS)
        odds[system.NAME] = (ensemble.tally(membership(kinds[system.COLUMN], symbols)), symbols)
    probability = ensemble.tally(membership(kinds["suitability"], SCALE.words))
    by_rule = kinds[["rule", "suitability"]].drop_duplicates().reset_index(drop=True)
    names = by_rule["rule"] + "\n" + by_rule["suitability"]
    shares = ensemble.tally(membership(kinds["rule"] + "\n" + kinds["suitability"], tuple(names)))
    behind = (by_rule["rule"].tolist(), by_rule["suitability"].tolist(), shares)
    return steps.Judged(odds, probability, behind, weighed.evidence, ensemble.weights)


def membership(names: pd.Series, classes: tuple[str, ...]) -> NDArray[np.float64]:
    """Return 1 where a record is of a class, shape (records, classes); a missing name is of the first class."""
    codes = pd.Index(classes).get_indexer(pd.Index(names.fillna(classes[0])))
    if (codes < 0).any():
        raise ValueError(f"not among the classes: {set(names.dropna()) - set(classes)}")
    rows: NDArray[np.float64] = np.eye(len(classes))[codes]
    return rows


def draw(
    gate: Gate, sheet: cells.Sheet, ranges: Ranges, judged: steps.Judged, scale: Scale, fill: steps.Fill
) -> NDArray[np.int8]:
    """Draw the verdict of the design zone of each step, jointly along the line."""
    settings, profile = gate.job.corridor.estimation, gate.job.corridor.profile
    shape = sheet.is_used.shape
    spacing, reach = (profile.step_m, profile.thickness_m), (ranges.horizontal, ranges.vertical)
    fields = probability_field(shape, spacing, reach, settings.realizations, settings.seed)
    zone = subgrade.natural_zone(sheet)
    draws = zone_draws(judged.probability.reshape(*shape, -1), zone.in_zone, fields, scale)
    material, unknown = subgrade.subgrade_material(sheet), scale.column("not assessed")
    return subgrade.with_fill(draws, material, fill.verdict, unknown, scale)


def imported(gate: Gate) -> steps.Fill:
    """Judge the imported material that the corridor file names, if it names one."""
    fill = gate.job.corridor.fill
    if fill is None:
        return steps.Fill("", SCALE.column("not assessed"), subgrade.IMPORTED_FILL)
    verdict = rules.rate(pd.DataFrame({"uscs_symbol": pd.array([fill.group], "string")}), gate.job.rule_sets).iloc[0]
    group = fill.group if gate.job.systems[0].COLUMN == "uscs_symbol" else ""
    rule = f"imported fill {fill.group}, by the corridor file: {verdict['rule']}; the ground beneath is not judged"
    return steps.Fill(group, int(verdict["verdict"]), rule)


def limits(gate: Gate) -> Scale:
    """Return the verdicts with the strictest limits of the rule sets."""
    strictest = rules.strictest(gate.job.rule_sets)
    return Scale(
        rules.VERDICTS,
        rules.WORST_FIRST,
        strictest.unsuitable_from,
        strictest.suitable_p_unsuitable_below,
        strictest.suitable_p_not_assessed_below,
    )
