"""Find one member of a family of modules by its name, or say which there are.

A plug-in is a module; a family is a tuple of modules, each with a ``NAME``. The tuple is the only list: the
command line, the README test and the error text all read it.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Protocol, TypeVar

from geomap.errors import UsageError, problem


class Named(Protocol):
    """Anything with a name: in practice a module."""

    @property
    def NAME(self) -> str:  # noqa: N802 - a module constant
        """Name by which a corridor file asks for it."""


class FileFormat(Named, Protocol):
    """A reader of one file format."""

    @property
    def SUFFIXES(self) -> tuple[str, ...]:  # noqa: N802 - a module constant
        """File name endings, lower case, with the dot."""


Member = TypeVar("Member", bound=Named)
Format = TypeVar("Format", bound=FileFormat)


def named(family: Sequence[Member], name: str, place: str) -> Member:
    """Return the member called `name`.

    Parameters
    ----------
    family
        The family's tuple.
    name
        What the user wrote.
    place
        File and key where it was written, for the message.

    Raises
    ------
    UsageError
        No member has that name; the text lists the choices and the nearest one.
    """
    for member in family:
        if name == member.NAME:
            return member
    raise UsageError(no_such_name(name, [member.NAME for member in family], place))


def for_file(family: Sequence[Format], path: Path, place: str) -> Format:
    """Return the format that reads files with the ending of `path`.

    Raises
    ------
    UsageError
        No format of this family has that ending; the text lists the endings that can be read.
    """
    suffix = path.suffix.lower()
    for member in family:
        if suffix in member.SUFFIXES:
            return member
    known = sorted({ending for member in family for ending in member.SUFFIXES})
    raise UsageError(
        problem(place, path.name, "a file ending in " + ", ".join(known), "convert the file or correct its name")
    )


def no_such_name(name: str, choices: Iterable[str], place: str) -> str:
    """Return the message for a name that is not among the choices, with the nearest one if there is any.

    Examples
    --------
    >>> no_such_name("astm_d2478", ["astm_d2487", "usda_texture"], "corridor.toml:12: systems")
    "corridor.toml:12: systems: found 'astm_d2478'; allowed: astm_d2487, usda_texture; did you mean astm_d2487?"
    """
    names = sorted(choices)
    same = [known for known in names if known.casefold() == name.casefold()]
    near = same or difflib.get_close_matches(name, names, n=1, cutoff=0.6)
    remedy = f"did you mean {near[0]}?" if near else "choose one of these"
    return problem(place, name, ", ".join(names) or "none yet", remedy)
