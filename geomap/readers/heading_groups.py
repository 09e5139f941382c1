"""Headings in two rows: a group above, such as "Percent passing", and its members beneath, such as 3/4 in and No. 4."""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass

from geomap.errors import InputError, problem
from geomap.readers.heading_rows import fit, is_units_row, mapping, readings
from geomap.readers.headings import Reading
from geomap.readers.options import TableOptions
from geomap.readers.sheets import HEADING_SEARCH_ROWS, Place, filled
from geomap.readers.sieves import size_from_heading
from geomap.readers.spelling import is_unit, key, plain
from geomap.tables.schema import Layout

FEWEST_SIEVES = 2  # ours: so many names of sieves make a row of words a second row of headings

_BRACKETS = re.compile(r"\s*[(\[]\s*([^()\[\]]+?)\s*[)\]]")
_NUMBER = re.compile(r"[<>]?\s*[+-]?(?:\d+[.,]?\d*|[.,]\d+)\s*%?")
_PASSING = re.compile(r"\b(?:passing|finer)\b")
_RETAINED = re.compile(
    r"^retained$|(?:%|\b(?:percent(?:age)?|pct|mass|weight|cumulative)\b).*\bretained\b|\bretained\b.*%"
)

Score = tuple[bool, int, int]  # all required columns or not, how many columns, how many stated units


@dataclass(frozen=True)
class HeadingRow:
    """The headings of a table, from one row or joined from two.

    Attributes
    ----------
    cells
        One heading for each column.
    first, last
        Positions of the rows that hold them, counted from 0; the same for one row.
    is_whole, count
        Whether all required columns are there, and how many columns are known.
    """

    cells: list[str]
    first: int
    last: int
    is_whole: bool
    count: int


def heading_row(rows: Sequence[Sequence[str]], layout: Layout, options: TableOptions) -> HeadingRow:
    """Return the headings that answer a layout best.

    Two rows are joined where together they mean more columns, or state more units, than the better one alone; and
    where a group says that the sieves beneath it are of percent retained, so that they do not pass for passing.
    """
    is_whole, count, top = fit(rows, layout, options)
    if not rows:
        return HeadingRow([], 0, 0, False, 0)
    mapped = mapping(layout, options, "corridor file")
    single = _score(rows[top], layout, mapped)
    best, best_score = HeadingRow(list(rows[top]), top, top, is_whole, count), single
    searched = range(min(len(rows), HEADING_SEARCH_ROWS) - 1)
    for upper in (index for index in searched if not is_whole or index in (top - 1, top)):
        cells, is_forced = joined(rows[upper], rows[upper + 1], layout, mapped, has_members=upper != top)
        score = _score(cells, layout, mapped)
        if cells and (score > best_score or (is_forced and score[0] >= is_whole)):
            best, best_score = HeadingRow(cells, upper, upper + 1, score[0], score[1]), score
    return best


def joined(
    upper: Sequence[str], lower: Sequence[str], layout: Layout, mapped: Mapping[str, str], has_members: bool = False
) -> tuple[list[str], bool]:
    """Return one heading for each column of two rows, and whether the upper one says that sieves are of retained.

    Nothing is returned where the rows are no headings in two rows: one has a number that names no sieve, the lower
    one has a word of its own under a required heading, or two columns would mean the same.

    Parameters
    ----------
    upper, lower
        The two rows.
    layout, mapped
        Which table it is, and the user's own headings by column.
    has_members
        The lower row is the one with the headings: a heading of the upper one does not count by itself.

    Examples
    --------
    >>> from geomap.tables import schema
    >>> upper, lower = ["Boring", "Depth (ft)", "", "Percent passing", ""], ["", "From", "To", "3/4 in", "No. 4"]
    >>> joined(upper, lower, schema.inputs()["samples"], {})
    (['Boring', 'Depth From (ft)', 'Depth To (ft)', '3/4 in', 'No. 4'], False)
    """
    none: tuple[list[str], bool] = ([], False)
    width = max(filled(upper), filled(lower))
    above, beneath = _padded(upper, width), _padded(lower, width)
    if not filled(upper) or not filled(lower) or is_units_row(lower) or any(map(is_number, above)):
        return none
    groups = _groups(above)
    must = {*_required(above, layout, mapped), *_required(beneath, layout, mapped)}
    retained = {p for p in range(width) if _is_of_retained(above, beneath, groups[p], p, must)}
    cells = []
    for p, (start, end) in enumerate(groups):
        group = above[start] if start >= 0 else ""
        is_alone = end == p + 1 and p not in must and not has_members
        if p in retained or not beneath[p] or not group:
            cells.append(f"{group} {beneath[p]}" if p in retained else beneath[p] or above[p])
        else:
            cells.append(_heading(group, beneath[p], is_alone, layout, mapped))
    means = [item if isinstance(item, Reading) else None for item in readings(cells, layout, mapped)]
    columns = [item.column for item in means if item is not None]
    odd = any(is_number(cell) and item is None for cell, item in zip(beneath, means, strict=True))
    lost = {above[p] and item is None for p, item in enumerate(means) if p in must}
    return none if odd or len(set(columns)) < len(columns) or any(lost) else (cells, bool(retained))


def _padded(row: Sequence[str], width: int) -> list[str]:
    return [*(" ".join(cell.split()) for cell in row[:width]), *[""] * (width - len(row))]


def _groups(above: Sequence[str]) -> list[tuple[int, int]]:
    """Return for each cell where its group starts and ends: blanks to the right of a text belong to it.

    Examples
    --------
    >>> _groups(["", "Depth", "", "LL"])
    [(-1, 1), (1, 3), (1, 3), (3, 4)]
    """
    starts = [p for p, cell in enumerate(above) if cell]
    edges = [-1, *starts, len(above)]
    spans = [(edges[k], edges[k + 1]) for k in range(len(edges) - 1)]
    return [span for span in spans for _ in range(max(span[0], 0), span[1])]


def _required(row: Sequence[str], layout: Layout, mapped: Mapping[str, str]) -> list[int]:
    """Return the positions of the cells of a row that mean a required column."""
    means = enumerate(readings(row, layout, mapped))
    return [p for p, item in means if isinstance(item, Reading) and item.column in layout.required]


def _is_of_retained(
    above: Sequence[str], beneath: Sequence[str], group: tuple[int, int], p: int, must: Collection[int]
) -> bool:
    """Return whether a cell names a sieve beneath a group of percent retained; a title over the table is no group."""
    start, end = group
    if start < 0 or set(range(start, end)) & set(must) or size_from_heading(beneath[p]) is None:
        return False
    words = plain(above[start])
    return bool(_RETAINED.search(words)) and not _PASSING.search(words)


def _heading(group: str, member: str, is_alone: bool, layout: Layout, mapped: Mapping[str, str]) -> str:
    """Return the words for a member of a group that are known, with a unit if any are; else all words of both."""
    units = [word for word in _BRACKETS.findall(group) if is_unit(word)]
    base = _BRACKETS.sub("", group)
    tried = [member, f"{group} {member}"]
    tried += [f"{base} {member} ({units[0]})"] if units else []
    tried += [f"{group} ({member.strip('()[] ')})"] if is_unit(member.strip("()[] ")) else []
    if _PASSING.search(plain(group)):
        tried += [f"passing {member} {unit}" for unit in units] + [f"passing {member}"]
    tried += [group] if is_alone else []
    own = {key(heading) for heading in mapped.values()}
    for words in tried:
        if key(words) in own:
            return words
    means = [(words, item) for words in tried for item in readings([words], layout, mapped)]
    known = [(words, item) for words, item in means if isinstance(item, Reading)]
    stated = [words for words, item in known if item.factor is not None]
    return stated[0] if stated else known[0][0] if known else f"{group} {member}"


def is_number(cell: str) -> bool:
    """Return whether a cell is a number, also a bounded one or a percentage.

    Examples
    --------
    >>> [is_number(cell) for cell in ("12.5", "<2", "12,5 %", "NP", "")]
    [True, True, True, False, False]
    """
    return _NUMBER.fullmatch(cell.strip()) is not None


def _score(row: Sequence[str], layout: Layout, mapped: Mapping[str, str]) -> Score:
    known = {item.column: item.factor for item in readings(row, layout, mapped) if isinstance(item, Reading)}
    is_whole = set(layout.required) <= set(known) and bool(known)
    return is_whole, len(known), sum(factor is not None for factor in known.values())


def check_no_second_row(
    rows: Sequence[Sequence[str]], headings: HeadingRow, layout: Layout, options: TableOptions, place: Place
) -> None:
    """Raise where the row beneath the headings names sieves and is no data.

    Raises
    ------
    InputError
        Says that the headings must stand in one row.
    """
    mapped = mapping(layout, options, str(place))
    row = rows[headings.last + 1] if len(rows) > headings.last + 1 else []
    words = [cell.strip() for cell in row if cell.strip()]
    sieves = [word for word in words if size_from_heading(word) is not None]
    is_repeated = {key(word) for word in words} <= {key(cell) for cell in headings.cells}
    if any(map(is_number, words)):  # numbers of sieves, or data
        sieves = _beneath_passing(row, headings, layout, mapped)
    if layout.takes_passing and len(sieves) >= FEWEST_SIEVES and not is_repeated:
        found = "a second row of headings: " + ", ".join(sieves[:5])
        remedy = "write each heading whole in one row, for example passing 3/4 in"
        raise InputError(problem(str(place), found, "one row of headings, or two that can be joined", remedy))


def _beneath_passing(row: Sequence[str], headings: HeadingRow, layout: Layout, mapped: Mapping[str, str]) -> list[str]:
    """Return the cells beneath a group of percent passing in a row without a name and without a required number."""
    above = _padded(headings.cells, max(len(headings.cells), len(row)))
    beneath = _padded(row, len(above))
    required = _required(above, layout, mapped)
    if not required or beneath[required[0]] or any(is_number(beneath[p]) for p in required):
        return []
    groups = [
        start >= 0 and end > start + 1 and bool(_PASSING.search(plain(above[start]))) for start, end in _groups(above)
    ]
    return [cell for cell, is_member in zip(beneath, groups, strict=True) if cell and is_member]
