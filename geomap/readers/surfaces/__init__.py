"""Formats of levels along the line: of the ground, or of the design.

A format is a module with ``NAME``, ``TITLE``, ``SUFFIXES`` and ``read(path, layout, options)``, listed in `FORMATS`.
"""

from __future__ import annotations

from geomap.readers.borings import TableFormat
from geomap.readers.surfaces import delimited_text, xlsx

FORMATS: tuple[TableFormat, ...] = (delimited_text, xlsx)
