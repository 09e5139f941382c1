"""Checks of laboratory values, in the order in which they build on each other."""

from __future__ import annotations

from geomap.intake import bearing, curves, gradations, groups, measures, plasticity

CHECKS = (
    *(*groups.CHECKS, *measures.CHECKS, *plasticity.CHECKS),
    *(*gradations.CHECKS, *curves.CHECKS, *bearing.CHECKS),
)
