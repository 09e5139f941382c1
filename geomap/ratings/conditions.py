"""Conditions of a rule set, judged in three-valued logic on whole columns.

A condition is a comparison of columns with numbers and texts, joined by ``and``, ``or`` and ``not``::

    uscs_symbol in ["CH", "MH"] and liquid_limit_pct > 50

A comparison with a missing value is neither true nor false but unknown, and ``and``, ``or``, ``not`` carry that on
as Kleene's strong logic does: false and unknown is false, true or unknown is true. (Kleene 1952, Introduction to
Metamathematics, section 64; from memory.) A value reported as less or more than a number, which its column
``<name>_bound`` tells, is compared as far as that decides.
"""

from __future__ import annotations

import ast
from collections.abc import Callable, Collection, Iterator, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.ratings.vocabulary import nearest, nearest_column, soil_columns
from geomap.tables import schema

_COMPARISONS: Mapping[type[ast.cmpop], Callable[[Any, Any], Any]] = {
    ast.Eq: lambda a, b: a == b,
    ast.NotEq: lambda a, b: a != b,
    ast.Lt: lambda a, b: a < b,
    ast.LtE: lambda a, b: a <= b,
    ast.Gt: lambda a, b: a > b,
    ast.GtE: lambda a, b: a >= b,
}
_LARGEST = 1e300  # numbers that floats can hold with room to spare


class ConditionError(ValueError):
    """A condition that cannot be read; the text says why."""


@dataclass(frozen=True)
class Truth:
    """Truth of a condition for each row: `yes`, `no`, and unknown where neither holds; boolean arrays."""

    yes: NDArray[np.bool_]
    no: NDArray[np.bool_]

    @property
    def unknown(self) -> NDArray[np.bool_]:
        """Rows where the data do not decide."""
        return ~(self.yes | self.no)


@dataclass(frozen=True)
class Condition:
    """A condition that was read and checked.

    Attributes
    ----------
    text
        As it stands in the rule set.
    columns
        The columns that it looks at, in order of appearance.
    """

    text: str
    columns: tuple[str, ...]
    tree: ast.expr

    def judge(self, table: Mapping[str, Any], rows: int) -> Truth:
        """Return the truth for each row of `table`; a column that the table lacks is missing throughout."""
        return _judge(self.tree, table, rows)

    def gaps(self, table: Mapping[str, Any], rows: int) -> Iterator[tuple[str, NDArray[np.bool_]]]:
        """Give each column with the rows where it is missing and leaves the condition unknown.

        A column that comes up more than once is given more than once.
        """
        return _gaps(self.tree, table, rows)


def condition_from_text(text: str, symbols: Mapping[str, Collection[str]] | None = None) -> Condition:
    """Read a condition.

    Parameters
    ----------
    text
        The condition.
    symbols
        For columns of classes, the only texts that they can hold; the texts of other columns are known here.

    Raises
    ------
    ConditionError
        It is not a condition, or it names a column that no soil has, or a text that the column cannot hold.

    Examples
    --------
    >>> condition_from_text("liquid_limit_pct <= 28 and plasticity_index_pct <= 6").columns
    ('liquid_limit_pct', 'plasticity_index_pct')
    """
    names: list[str] = []
    try:
        tree = ast.parse(text.strip(), mode="eval").body
        _check(tree, symbols or {}, names)
    except SyntaxError as error:
        raise ConditionError(f"cannot be read at character {error.offset or 0}") from None
    except (RecursionError, MemoryError):
        raise ConditionError("cannot be read, it is nested too deeply") from None
    except ConditionError:
        raise
    except ValueError:  # a null character, before Python 3.12
        raise ConditionError("cannot be read") from None
    return Condition(text, tuple(dict.fromkeys(names)), tree)


def _check(node: ast.expr, symbols: Mapping[str, Collection[str]], names: list[str]) -> None:
    if isinstance(node, ast.BoolOp):
        for part in node.values:
            _check(part, symbols, names)
    elif isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.Not):
        _check(node.operand, symbols, names)
    elif isinstance(node, ast.Compare) and len(node.ops) == 1 and isinstance(node.left, ast.Name):
        column = _soil_column(node.left.id)
        _check_values(node, column, _values(node, column), symbols)
        names.append(column.name)
    elif isinstance(node, ast.Constant) and isinstance(node.value, bool):
        pass
    else:
        raise ConditionError(
            f"{ast.unparse(node)!r} is not a comparison of one column with a number, a text or a list of texts"
        )


def _soil_column(name: str) -> schema.Column:
    if name in soil_columns():
        return soil_columns()[name]
    try:
        schema.column(name)
        why = f"{name!r} is not a column that describes soil"
    except KeyError:
        why = f"there is no column {name!r}"
    near = nearest_column(name)
    raise ConditionError(f"{why}; " + (f"did you mean {near}?" if near else "take one of the samples table"))


def _values(node: ast.Compare, column: schema.Column) -> list[Any]:
    """Return what the column is compared with, one value or the list, if the operator goes with it."""
    operator, said = node.ops[0], ast.unparse(node)
    try:
        value = ast.literal_eval(node.comparators[0])
    except (ValueError, TypeError):
        raise ConditionError(f"{ast.unparse(node.comparators[0])!r} is not a number, a text or a list") from None
    if isinstance(value, list) != isinstance(operator, ast.In | ast.NotIn):
        raise ConditionError(f"{said!r}: a list goes with `in` and nothing else does")
    if value == []:
        raise ConditionError(f"{said!r}: the list is empty")
    if not isinstance(operator, ast.In | ast.NotIn | ast.Eq | ast.NotEq):
        if type(operator) not in _COMPARISONS:
            raise ConditionError(f"{said!r} is not a comparison with ==, !=, <, <=, >, >=, in or not in")
        if column.type not in ("number", "integer"):
            raise ConditionError(f"{said!r}: {column.name} is compared with {column.allowed}, by ==, !=, in or not in")
    return value if isinstance(value, list) else [value]


def _check_values(
    node: ast.Compare, column: schema.Column, values: list[Any], symbols: Mapping[str, Collection[str]]
) -> None:
    for value in values:
        if not _is_of(column.type, value):
            raise ConditionError(f"{ast.unparse(node)!r}: {column.name} is compared with {column.allowed}")
        choices = column.choices or symbols.get(column.name, ())
        if choices and value not in choices:
            near = nearest(value, choices)
            remedy = f"did you mean {near!r}?" if near else "choose one of these"
            raise ConditionError(f"{column.name} is never {value!r} but one of {', '.join(choices)}; {remedy}")


def _is_of(kind: str, value: object) -> bool:
    if kind in ("number", "integer"):
        return isinstance(value, int | float) and not isinstance(value, bool) and abs(value) < _LARGEST
    return isinstance(value, bool if kind == "flag" else str)


def _judge(node: ast.expr, table: Mapping[str, Any], rows: int) -> Truth:
    if isinstance(node, ast.BoolOp):
        parts = [_judge(part, table, rows) for part in node.values]
        both = isinstance(node.op, ast.And)
        join_yes, join_no = (np.logical_and, np.logical_or) if both else (np.logical_or, np.logical_and)
        return Truth(join_yes.reduce([p.yes for p in parts]), join_no.reduce([p.no for p in parts]))
    if isinstance(node, ast.UnaryOp):
        part = _judge(node.operand, table, rows)
        return Truth(part.no, part.yes)
    if isinstance(node, ast.Constant):
        return Truth(np.full(rows, bool(node.value)), np.full(rows, not node.value))
    return _compare(node, table, rows)


def _gaps(node: ast.expr, table: Mapping[str, Any], rows: int) -> Iterator[tuple[str, NDArray[np.bool_]]]:
    unknown = _judge(node, table, rows).unknown
    if isinstance(node, ast.Compare) and isinstance(node.left, ast.Name):
        yield node.left.id, unknown
    elif isinstance(node, ast.BoolOp | ast.UnaryOp):
        for part in node.values if isinstance(node, ast.BoolOp) else [node.operand]:
            for name, missing in _gaps(part, table, rows):
                yield name, missing & unknown


def _compare(node: ast.expr, table: Mapping[str, Any], rows: int) -> Truth:
    if not isinstance(node, ast.Compare) or not isinstance(node.left, ast.Name):
        raise TypeError(ast.dump(node))
    if node.left.id not in table:
        return Truth(np.zeros(rows, bool), np.zeros(rows, bool))
    values = pd.Series(np.asarray(table[node.left.id]))
    known = values.notna().to_numpy()
    wanted = ast.literal_eval(node.comparators[0])
    operator = node.ops[0]
    if f"{node.left.id}_bound" in table:
        values, is_decided = _within(values, table[f"{node.left.id}_bound"], wanted)
        known = known & is_decided  # what pandas hands out may be read-only
    met = np.zeros(rows, bool)
    if isinstance(operator, ast.In | ast.NotIn):
        met[known] = values[known].isin(wanted).to_numpy() ^ isinstance(operator, ast.NotIn)
    else:
        met[known] = np.asarray(_COMPARISONS[type(operator)](values[known].to_numpy(), wanted), dtype=bool)
    return Truth(met, known & ~met)


def _within(values: pd.Series[Any], bound: Any, wanted: Any) -> tuple[pd.Series[Any], NDArray[np.bool_]]:
    """Return numbers that stand for values reported as less or more than, and whether the bound decides.

    Of "<5" it is known that it is less than 7, and nothing is known of it and 3.
    """
    limits, signs = np.atleast_1d(wanted), pd.Series(np.asarray(bound))
    less, more = ((signs == sign).fillna(False).to_numpy(bool) for sign in "<>")
    given = values.to_numpy(np.float64, na_value=np.nan)
    inside = np.nextafter(given, np.where(less, -np.inf, np.where(more, np.inf, given)))
    is_decided = ~(less & (given > limits.min())) & ~(more & (given < limits.max()))
    return pd.Series(inside), is_decided
