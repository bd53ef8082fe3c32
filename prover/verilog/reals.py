"""Real constants as the doubles of IEEE 754 that simulators compute with (IEEE 1364-2005 clauses 3.5.2 and 4.8).

A real number is no hardware: it has to come to a word, by an assignment or a comparison, before elaboration
ends. Functions raise ValueError with the reason where the standard leaves a result open.
"""

from __future__ import annotations

import math
import operator
from collections.abc import Callable
from typing import Any

from pyverilog.vparser import ast as vast

# Above it neighbouring integers fall on one double.
EXACT_BITS = 53

REAL_FUNCTIONS: dict[str, Callable[[float], float]] = {
    "itor": float,
    "floor": lambda value: float(math.floor(value)),
    "ceil": lambda value: float(math.ceil(value)),
}
"""System functions whose result is real (clauses 17.8 and 17.11.2)."""

COMPARISONS: dict[Any, Callable[[Any, Any], bool]] = {
    vast.Eq: operator.eq, vast.NotEq: operator.ne, vast.LessThan: operator.lt, vast.LessEq: operator.le,
    vast.GreaterThan: operator.gt, vast.GreaterEq: operator.ge,
}  # fmt: skip


def operands(node: Any) -> tuple[Any, ...]:
    """The operands of which one real makes the result real (clause 5.5.1)."""
    if isinstance(node, (vast.Plus, vast.Minus, vast.Times, vast.Divide, vast.Power)):
        return node.left, node.right
    if isinstance(node, vast.Cond):
        return node.true_value, node.false_value
    return (node.right,) if isinstance(node, vast.Uminus) else ()


def literal(text: str) -> float:
    """The double nearest to a real number as written."""
    return _finite(float(text.replace("_", "")))


def combined(kind: Any, left: float, right: float) -> float:
    """The result of an arithmetic operator (clause 5.1.5)."""
    if kind is vast.Divide:
        if not right:
            raise ValueError("a division by zero")
        return _finite(left / right)
    if kind is not vast.Power:
        return _finite({vast.Plus: left + right, vast.Minus: left - right, vast.Times: left * right}[kind])
    if (left == 0 and right <= 0) or (left < 0 and not right.is_integer()):
        raise ValueError(f"{left} ** {right}, which has no value")
    try:
        return math.pow(left, right)
    except OverflowError:
        return _finite(math.inf)


def _finite(value: float) -> float:
    if not math.isfinite(value):
        raise ValueError("a real number that is too large")
    return value


def rounded(value: float) -> int:
    """The nearest integer, ties away from zero (clause 4.8.2)."""
    whole = math.trunc(value)
    return whole + (int(math.copysign(1, value)) if abs(value - whole) >= 0.5 else 0)


def whole_bound(kind: Any, value: float, left: bool) -> int:
    """The integer that divides the integers just as the value does; `left` tells that it stands on the left."""
    down = kind in (vast.GreaterThan, vast.LessEq)
    return math.floor(value) if down != left else math.ceil(value)
