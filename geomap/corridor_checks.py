"""The corridor file against what is around it: the files it names, the names known here, and one key against another.

Nothing here knows a key: `corridor` says which to look at. Each function returns problems, one text for each.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from geomap.corridor_text import place
from geomap.errors import problem
from geomap.registry import no_such_name
from geomap.tables import schema

Keys = tuple[str, ...]


@dataclass(frozen=True)
class Written:
    """A corridor file as it stands on the disk: its path, its text, and what TOML makes of that."""

    path: Path
    text: str
    data: Mapping[str, Any]

    def place(self, *keys: str) -> str:
        """Return file, line, section and key; no line for a key that is left to its default."""
        part: Any = self.data
        for key in keys:
            part = part.get(key) if isinstance(part, Mapping) else None
        if part is None:
            return f"{self.path.name}: [{keys[0]}] {'.'.join(keys[1:])} (by default)"
        return place(self.path.name, self.text, keys)


def file_problems(written: Written, files: Mapping[str, Sequence[str]]) -> list[str]:
    """Return what is wrong with the input files of each section."""
    found = []
    folder = written.path.parent
    for section, names in files.items():
        where = written.place(section, "file")
        for name in names:
            target = (folder / name).resolve()
            if not target.is_relative_to(folder):
                found.append(problem(where, name, "a file inside the folder of the corridor file", "copy it there"))
            elif not target.is_file():
                remedy = "correct the name; it is relative to the corridor file"
                found.append(problem(where, name, "a file that exists", remedy))
    return found


def name_problems(
    written: Written, asked: Mapping[Keys, Sequence[str]], known: Mapping[str, Collection[str]]
) -> list[str]:
    """Return the names that are not known, with the nearest that is, and those given twice."""
    found = []
    for keys, names in asked.items():
        where, choices = written.place(*keys), known[keys[-1]]
        found += [no_such_name(name, choices, where) for name in names if name not in choices]
        if len(set(names)) < len(names):
            found.append(problem(where, ", ".join(names), "each name once", "delete the second one"))
    return found


def heading_problems(written: Written, layouts: Mapping[str, str], columns: Mapping[str, Iterable[str]]) -> list[str]:
    """Return the columns that a heading is mapped to and that the table of its section does not have."""
    found = []
    for section, names in columns.items():
        layout = schema.inputs()[layouts.get(section, section)]
        for name in names:
            welcome = layout.takes_passing and schema.size_from_passing_column(name) is not None
            if name not in layout.columns and not welcome:
                found.append(no_such_name(name, layout.columns, written.place(section, "columns", name)))
    return found


def order_problems(written: Written, less: tuple[Keys, float], more: tuple[Keys, float], remedy: str) -> list[str]:
    """Return what is wrong where the value of one key is greater than that of another."""
    if less[1] <= more[1]:
        return []
    allowed = f"at most {more[1]}, the value at {written.place(*more[0])}"
    return [problem(written.place(*less[0]), less[1], allowed, remedy)]
