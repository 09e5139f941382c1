"""Intake: every value accepted, queried or rejected with a finding, and no row lost.

Four calls, in the order of the job::

    taken = accept(raw_tables)                   # cells -> typed columns
    taken = screen(taken)                        # rows, depths, laboratory values
    taken = place(taken, placed, half_width_m)   # once the borings are located on the alignment
    taken = agree(taken, classified, records)    # once the samples are classified

Each returns an :class:`Intake`: ``used(table)``, ``rows(table)``, ``findings``, ``counts()`` and ``blocks``. A check is
a function ``check(intake) -> intake`` in one of the modules; ``CHECKS`` of the module lists it.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable

from geomap.intake import depths, rows, soil, strata
from geomap.intake.agreement import check as agree
from geomap.intake.bearing import held_out
from geomap.intake.entries import Entries, Intake
from geomap.intake.places import check as place
from geomap.intake.values import accept

SOIL_CHECKS = soil.CHECKS  # all that a laboratory table alone can be checked for
CHECKS = (*rows.CHECKS, *depths.CHECKS, *strata.CHECKS, *soil.CHECKS)

__all__ = ["CHECKS", "SOIL_CHECKS", "Entries", "Intake", "accept", "agree", "held_out", "place", "screen"]


def screen(intake: Intake, checks: Iterable[Callable[[Intake], Intake]] = CHECKS) -> Intake:
    """Judge rows, depths and laboratory values; afterwards gradations are one long table of points.

    Parameters
    ----------
    intake
        Typed tables from :func:`accept`, of any layouts; a table that is not there is not asked for.
    checks
        What to check, in order. Without :data:`SOIL_CHECKS` passing columns stay in the samples table.
    """
    for check in checks:
        intake = check(intake)
    return rows.left_out_together(intake)
