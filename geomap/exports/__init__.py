"""Outputs: each draws `Results` in one form, into a staging folder; `publish` puts them in place together."""

from __future__ import annotations

from pathlib import Path
from typing import Protocol

from geomap.exports import geopackage, schedules, web_map
from geomap.results import Results


class Export(Protocol):
    """One kind of output: in practice a module."""

    @property
    def NAME(self) -> str:  # noqa: N802 - a module constant
        """Name by which a corridor file asks for it."""

    @property
    def TITLE(self) -> str:  # noqa: N802 - a module constant
        """What it is, in a line."""

    def write(self, results: Results, folder: Path) -> list[Path]:
        """Write the output into `folder`, an empty staging folder, and return the paths of its files."""


EXPORTS: tuple[Export, ...] = (geopackage, web_map, schedules)
