"""Formats of tables that belong to borings: borings, samples, gradations, strata and the like.

A format is a module shaped as :class:`TableFormat`, listed in `FORMATS`; `geomap.registry.for_file` finds it by the
ending of the file.
"""

from __future__ import annotations

from pathlib import Path
from typing import Protocol

from geomap.readers.borings import delimited_text, geojson, geopackage, shapefile, xlsx
from geomap.readers.options import TableOptions
from geomap.tables.raw import RawTable


class TableFormat(Protocol):
    """A format that holds tables."""

    @property
    def NAME(self) -> str:  # noqa: N802 - a module constant
        """Short name, as `geomap list` shows it."""

    @property
    def TITLE(self) -> str:  # noqa: N802 - a module constant
        """What it is, in words."""

    @property
    def SUFFIXES(self) -> tuple[str, ...]:  # noqa: N802 - a module constant
        """File name endings, lower case, with the dot."""

    def read(self, path: Path, layout: str, options: TableOptions) -> RawTable:
        """Return the table of `path` in the input layout named `layout`.

        Raises
        ------
        InputError
            The file cannot be used.
        UsageError
            A sheet, layer or heading named in `options` is not in the file.
        """


FORMATS: tuple[TableFormat, ...] = (delimited_text, xlsx, geopackage, geojson, shapefile)
