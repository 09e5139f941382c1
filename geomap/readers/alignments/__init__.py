"""Formats of the alignment: one line, or its vertices in a table.

A format is a module shaped as :class:`LineFormat`, listed in `FORMATS`; `geomap.registry.for_file` finds it by the
ending of the file.
"""

from __future__ import annotations

from pathlib import Path
from typing import Protocol

from geomap.readers.alignments import delimited_text, geojson, geopackage, shapefile, xlsx
from geomap.readers.alignments.lines import RawLine
from geomap.readers.options import TableOptions

__all__ = ["FORMATS", "LineFormat", "RawLine"]


class LineFormat(Protocol):
    """A format that holds a line."""

    @property
    def NAME(self) -> str:  # noqa: N802 - a module constant
        """Short name, as `geomap list` shows it."""

    @property
    def TITLE(self) -> str:  # noqa: N802 - a module constant
        """What it is, in words."""

    @property
    def SUFFIXES(self) -> tuple[str, ...]:  # noqa: N802 - a module constant
        """File name endings, lower case, with the dot."""

    def read(self, path: Path, options: TableOptions) -> RawLine:
        """Return the one line of `path`.

        Raises
        ------
        InputError
            The file cannot be used, or does not hold one connected line.
        UsageError
            A sheet, layer or heading named in `options` is not in the file.
        """


FORMATS: tuple[LineFormat, ...] = (geojson, geopackage, shapefile, delimited_text, xlsx)
