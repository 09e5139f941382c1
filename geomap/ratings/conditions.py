"""Conditions of a rule set, judged in three-valued logic on whole columns.

A condition is a comparison of columns with numbers and texts, joined by ``and``, ``or`` and ``not``::

    uscs_symbol in ["CH", "MH"] and liquid_limit_pct > 50

A comparison with a missing value is neither true nor false but unknown, and ``and``, ``or``, ``not`` carry that on
as Kleene's strong logic does: false and unknown is false, true or unknown is true. (Kleene 1952, Introduction to
Metamathematics, section 64; from memory.)
"""

from __future__ import annotations

import ast
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from geomap.tables import schema

_COMPARISONS: Mapping[type[ast.cmpop], Callable[[Any, Any], Any]] = {
    ast.Eq: lambda a, b: a == b,
    ast.NotEq: lambda a, b: a != b,
    ast.Lt: lambda a, b: a < b,
    ast.LtE: lambda a, b: a <= b,
    ast.Gt: lambda a, b: a > b,
    ast.GtE: lambda a, b: a >= b,
}


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


def condition_from_text(text: str) -> Condition:
    """Read a condition.

    Raises
    ------
    ConditionError
        It is not a condition, or it names a column that geomap does not have.

    Examples
    --------
    >>> condition_from_text("liquid_limit_pct <= 28 and plasticity_index_pct <= 6").columns
    ('liquid_limit_pct', 'plasticity_index_pct')
    """
    try:
        tree = ast.parse(text.strip(), mode="eval").body
    except SyntaxError as error:
        raise ConditionError(f"cannot be read at character {error.offset or 0}") from None
    names: list[str] = []
    _check(tree, names)
    return Condition(text, tuple(dict.fromkeys(names)), tree)


def _check(node: ast.expr, names: list[str]) -> None:
    if isinstance(node, ast.BoolOp):
        for part in node.values:
            _check(part, names)
    elif isinstance(node, ast.UnaryOp) and isinstance(node.op, ast.Not):
        _check(node.operand, names)
    elif isinstance(node, ast.Compare) and len(node.ops) == 1 and isinstance(node.left, ast.Name):
        _check_comparison(node, node.left.id, names)
    elif isinstance(node, ast.Constant) and isinstance(node.value, bool):
        pass
    else:
        raise ConditionError(
            f"{ast.unparse(node)!r} is not a comparison of one column with a number, a text or a list of texts"
        )


def _check_comparison(node: ast.Compare, name: str, names: list[str]) -> None:
    try:
        column = schema.column(name)
    except KeyError:
        raise ConditionError(f"there is no column {name!r}") from None
    try:
        value = ast.literal_eval(node.comparators[0])
    except ValueError:
        raise ConditionError(f"{ast.unparse(node.comparators[0])!r} is not a number, a text or a list") from None
    values = value if isinstance(value, list) else [value]
    if isinstance(value, list) != isinstance(node.ops[0], ast.In | ast.NotIn):
        raise ConditionError(f"{ast.unparse(node)!r}: a list goes with `in` and nothing else does")
    wanted: Any = str if column.type in ("text", "date") else bool if column.type == "flag" else (int, float)
    if not all(isinstance(v, wanted) for v in values):
        raise ConditionError(f"{ast.unparse(node)!r}: {name} is compared with {column.allowed}")
    names.append(name)


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


def _compare(node: ast.expr, table: Mapping[str, Any], rows: int) -> Truth:
    if not isinstance(node, ast.Compare) or not isinstance(node.left, ast.Name):
        raise TypeError(ast.dump(node))
    if node.left.id not in table:
        return Truth(np.zeros(rows, bool), np.zeros(rows, bool))
    values = pd.Series(np.asarray(table[node.left.id]))
    known = values.notna().to_numpy()
    wanted = ast.literal_eval(node.comparators[0])
    operator = node.ops[0]
    met = np.zeros(rows, bool)
    if isinstance(operator, ast.In | ast.NotIn):
        met[known] = values[known].isin(wanted).to_numpy() ^ isinstance(operator, ast.NotIn)
    else:
        met[known] = np.asarray(_COMPARISONS[type(operator)](values[known].to_numpy(), wanted), dtype=bool)
    return Truth(met, known & ~met)
