"""Short hands for the tests of readers: write a small file, read it by its ending."""

from __future__ import annotations

from pathlib import Path

from geomap.readers import alignments, borings
from geomap.readers.alignments import RawLine
from geomap.readers.options import TableOptions
from geomap.registry import for_file
from geomap.tables.raw import RawTable


def read(path: Path, layout: str = "samples", **options: object) -> RawTable:
    """Read a table as the pipeline does."""
    return for_file(borings.FORMATS, path, "test").read(path, layout, TableOptions(**options))


def read_line(path: Path, **options: object) -> RawLine:
    """Read an alignment as the pipeline does."""
    return for_file(alignments.FORMATS, path, "test").read(path, TableOptions(**options))


def text_file(folder: Path, text: str, name: str = "table.csv", encoding: str = "utf-8") -> Path:
    """Write a text file with the line ends given."""
    path = folder / name
    path.write_bytes(text.encode(encoding))
    return path


def cells(table: RawTable) -> dict[str, list[str | None]]:
    """Return the cells by column, None for a blank."""
    plain = table.cells.astype(object).where(table.cells.notna(), None)
    return {str(name): plain[name].tolist() for name in plain}


def checks(table: RawTable | RawLine) -> dict[str, str]:
    """Return the action of each check that has a finding."""
    if not len(table.findings):
        return {}
    return dict(zip(table.findings["topic"], table.findings["action"], strict=True))
