"""A ratio, a high time or a condition as a formula of inputs and parameters: read safely, computed exactly.

The language is that of Python's expressions, cut down to numbers, names, arithmetic, comparisons, `and`, `or`, `not`,
`a if b else c`, `min` and `max`. Python's own parser reads it, nothing of it is ever run by Python, and all numbers
are fractions. A comparison is 1 or 0, and a condition holds where it is not 0.
"""

from __future__ import annotations

import ast
import re
from collections.abc import Mapping
from dataclasses import dataclass, field
from fractions import Fraction

from prover.errors import UserError

LONGEST = 200
"""Characters of a formula. Python's parser and the walk over its tree are safe up to there."""

MOST_BITS = 4096
"""Bits of any number on the way: a power beyond that is a mistake, or an attack."""

HINT = "such as 2*(div+1): numbers, names of inputs and parameters, + - * / // % **, min, max and comparisons"


@dataclass(frozen=True, slots=True)
class Formula:
    """A formula as written, its tree, and the names in it in order of their first use."""

    text: str
    tree: ast.expr = field(compare=False, repr=False)
    names: tuple[str, ...] = field(compare=False)

    def value(self, values: Mapping[str, int]) -> Fraction:
        """The value where each name has the value given. Raises UserError where that is no number."""
        try:
            return _value(self.tree, values)
        except ZeroDivisionError:
            raise UserError(
                f"'{self.text}' divides by zero{_at(self.names, values)}",
                hint="leave that value out, or write the formula another way",
            ) from None
        except OverflowError:
            raise UserError(
                f"'{self.text}' is too large a number{_at(self.names, values)}",
                hint="a ratio is a small number",
            ) from None


def _at(names: tuple[str, ...], values: Mapping[str, int]) -> str:
    told = ", ".join(f"{name}={values[name]}" for name in names if name in values)
    return f" at {told}" if told else ""


def read(text: str, option: str) -> Formula:
    """The formula in a text. Raises UserError for anything beyond the language."""
    plain = text.strip()
    if len(plain) > LONGEST:
        raise UserError(f"{option}: a formula of {len(plain)} characters", hint=f"give at most {LONGEST}")
    try:
        # Python would pass over a comment, and join lines within brackets.
        if "#" in plain or not plain.isprintable():
            raise ValueError
        tree = ast.parse(plain, mode="eval").body
    except (SyntaxError, ValueError, MemoryError, RecursionError):
        raise UserError(f"{option} '{plain}' is not a formula", hint=HINT) from None
    names: dict[str, None] = {}
    _check(tree, plain, option, names)
    return Formula(plain, tree, tuple(names))


BINARY: dict[type[ast.operator], str] = {
    ast.Add: "+", ast.Sub: "-", ast.Mult: "*", ast.Div: "/", ast.FloorDiv: "//", ast.Mod: "%", ast.Pow: "**",
}  # fmt: skip
COMPARED: dict[type[ast.cmpop], str] = {
    ast.Lt: "<", ast.LtE: "<=", ast.Gt: ">", ast.GtE: ">=", ast.Eq: "==", ast.NotEq: "!=",
}  # fmt: skip
FUNCTIONS = ("min", "max")


def _check(node: ast.expr, text: str, option: str, names: dict[str, None]) -> None:
    """Refuse whatever is not of the language, and note the names."""
    if isinstance(node, ast.Constant) and _number(node, text) is not None:
        return
    if isinstance(node, ast.Name) and node.id not in FUNCTIONS:
        names[node.id] = None
        return
    parts = _parts(node)
    if parts is None:
        part = ast.get_source_segment(text, node) or text
        raise UserError(f"{option} '{text}': '{part}' is not understood", hint=HINT)
    for inner in parts:
        _check(inner, text, option, names)


def _parts(node: ast.expr) -> list[ast.expr] | None:
    """The operands of a node of the language; None for any other."""
    match node:
        case ast.BinOp(left, op, right) if type(op) in BINARY:
            return [left, right]
        case ast.UnaryOp(ast.USub() | ast.UAdd() | ast.Not(), operand):
            return [operand]
        case ast.BoolOp(_, values):
            return values
        case ast.IfExp(test, body, orelse):
            return [test, body, orelse]
        case ast.Compare(left, ops, comparators) if all(type(op) in COMPARED for op in ops):
            return [left, *comparators]
        case ast.Call(ast.Name(name), args, []) if name in FUNCTIONS and args:
            return args
    return None


def _number(node: ast.Constant, text: str) -> Fraction | None:
    """A number as written, without the rounding of a float; None for anything else."""
    written = (ast.get_source_segment(text, node) or "").replace("_", "")
    if isinstance(node.value, int) and not isinstance(node.value, bool):
        return Fraction(node.value)
    if not re.fullmatch(r"\d+\.\d+", written) or Fraction(written) != Fraction(repr(node.value)):
        return None
    return Fraction(written)


def _value(node: ast.expr, values: Mapping[str, int]) -> Fraction:
    match node:
        case ast.Constant(value):
            return Fraction(repr(value))
        case ast.Name(name):
            return Fraction(values[name])
        case ast.UnaryOp(op, operand):
            inner = _value(operand, values)
            return (
                Fraction(not inner)
                if isinstance(op, ast.Not)
                else -inner
                if isinstance(op, ast.USub)
                else inner
            )
        case ast.BinOp(left, op, right):
            return _binary(BINARY[type(op)], _value(left, values), _value(right, values))
        case ast.BoolOp(op, parts):
            wanted = isinstance(op, ast.Or)
            return Fraction(wanted if any(bool(_value(p, values)) == wanted for p in parts) else not wanted)
        case ast.IfExp(test, body, orelse):
            return _value(body if _value(test, values) else orelse, values)
        case ast.Compare(left, ops, comparators):
            operands = [_value(x, values) for x in (left, *comparators)]
            pairs = zip(operands, ops, operands[1:], strict=False)
            return Fraction(all(_compared(COMPARED[type(op)], a, b) for a, op, b in pairs))
        case ast.Call(ast.Name(name), args, _):
            return (min if name == "min" else max)(_value(x, values) for x in args)
    raise AssertionError("a node that was let in and is not known")


def _binary(op: str, a: Fraction, b: Fraction) -> Fraction:
    if op == "**":
        if b.denominator != 1 or abs(b) * max(_bits(a), 1) > MOST_BITS:
            raise OverflowError
        return a ** int(b)
    if op in "/ // %" and b == 0:
        raise ZeroDivisionError
    match op:
        case "+":
            out = a + b
        case "-":
            out = a - b
        case "*":
            out = a * b
        case "/":
            out = a / b
        case "//":
            out = Fraction(a // b)
        case _:
            out = a % b
    if _bits(out) > MOST_BITS:
        raise OverflowError
    return out


def _bits(x: Fraction) -> int:
    return max(x.numerator.bit_length(), x.denominator.bit_length())


def _compared(op: str, a: Fraction, b: Fraction) -> bool:
    match op:
        case "<":
            return a < b
        case "<=":
            return a <= b
        case ">":
            return a > b
        case ">=":
            return a >= b
        case "==":
            return a == b
    return a != b
