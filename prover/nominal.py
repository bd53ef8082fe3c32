"""Formulas of inputs as words: what a solver needs where `formula` has fractions.

A value is carried as a numerator, a signed word wide enough for all that it can be, over a fixed denominator; what it
can be is bounded by interval arithmetic from the inputs' ranges, so that no word ever wraps. What has no such form (a
negative number divided with a remainder, division by an input) is written out as a table while that is small.
"""

from __future__ import annotations

import ast
import math
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import product

from prover import expr as e
from prover.expr import Expr
from prover.formula import BINARY, COMPARED, Formula

MOST_LISTED = 1 << 12
"""Values of the inputs up to which a formula without a form as a word is written out as a table."""

MOST_EXPONENTS = 128
"""Values of an exponent up to which a power of a number is written out."""

WIDEST = 512
"""Bits of a word on the way."""


class NoWord(Exception):
    """A formula that can't be written as a word; the message says why."""


@dataclass(frozen=True, slots=True)
class Value:
    """A number: a signed word over a denominator, and the ends between which the numerator lies."""

    word: Expr
    over: int
    low: int
    high: int


Ends = Mapping[str, tuple[int, int]]


def whole(
    formula: Formula, times: int, inputs: Mapping[str, int], ends: Ends, fixed: Mapping[str, int]
) -> Expr:
    """The formula times a number, as an unsigned word over the inputs (name to width), whose values lie within
    `ends`.

    Right wherever that is a whole number that is not negative. Raises NoWord where it can't be written."""
    names = {name: _input(name, width, ends[name]) for name, width in inputs.items()}
    names |= {name: _number(Fraction(value)) for name, value in fixed.items() if name not in inputs}
    try:
        found = _scaled(_word(formula.tree, names), times)
        if found.over != 1 or found.low < 0:
            raise NoWord(f"'{formula.text}' is not always a whole number")
        return e.extract(found.word, max(found.high.bit_length(), 1) - 1, 0)
    except NoWord:
        return _table(formula, times, inputs, ends, fixed)


def condition(formula: Formula, inputs: Mapping[str, int], ends: Ends, fixed: Mapping[str, int]) -> Expr:
    """One bit over the inputs: the formula is not 0. Raises NoWord where it can't be written."""
    names = {name: _input(name, width, ends[name]) for name, width in inputs.items()}
    names |= {name: _number(Fraction(value)) for name, value in fixed.items() if name not in inputs}
    try:
        return e.nonzero(_word(formula.tree, names).word)
    except NoWord:
        return e.nonzero(_rows(inputs, ends, 1, lambda values: int(formula.value({**fixed, **values}) != 0)))


def _table(
    formula: Formula, times: int, inputs: Mapping[str, int], ends: Ends, fixed: Mapping[str, int]
) -> Expr:
    def value(values: Mapping[str, int]) -> int:
        out = formula.value({**fixed, **values}) * times
        return max(0, int(out)) if out.denominator == 1 else 0

    most = max((value(values) for values in _every(inputs, ends)), default=0)
    return _rows(inputs, ends, max(most.bit_length(), 1), value)


def _every(inputs: Mapping[str, int], ends: Ends) -> Iterator[dict[str, int]]:
    if math.prod(high - low + 1 for low, high in (ends[name] for name in inputs)) > MOST_LISTED:
        raise NoWord("a formula that is no word, of too many values to write each out")
    for values in product(*(range(ends[name][0], ends[name][1] + 1) for name in inputs)):
        yield dict(zip(inputs, values, strict=True))


def _rows(
    inputs: Mapping[str, int], ends: Ends, width: int, value: Callable[[Mapping[str, int]], int]
) -> Expr:
    out = e.const(0, width)
    for values in _every(inputs, ends):
        here = e.conj(e.eq(e.var(name, inputs[name]), e.const(x, inputs[name])) for name, x in values.items())
        out = e.ite(here, e.const(value(values), width), out)
    return out


# -- arithmetic --------------------------------------------------------------------------------------------


def _made(word: Expr, over: int, low: int, high: int) -> Value:
    """The value in a signed word that is just wide enough."""
    wide = max(low.bit_length(), high.bit_length()) + 1
    if wide > WIDEST:
        raise NoWord("a number that is too large")
    kept = e.extract(word, wide - 1, 0) if wide < word.width else e.sign_extend(word, wide - word.width)
    return Value(kept, over, low, high)


def _input(name: str, width: int, ends: tuple[int, int]) -> Value:
    return _made(e.zero_extend(e.var(name, width), 1), 1, *ends)


def _number(value: Fraction) -> Value:
    top = value.numerator
    return Value(e.const(top, top.bit_length() + 1), value.denominator, top, top)


def _scaled(a: Value, by: int) -> Value:
    """The value times a whole number, the fraction reduced where that is plain."""
    common = math.gcd(by, a.over)
    by, over = by // common, a.over // common
    low, high = sorted((a.low * by, a.high * by))
    wide = max(low.bit_length(), high.bit_length(), a.word.width) + 1
    word = e.bvmul(e.sign_extend(a.word, wide - a.word.width), e.const(by, wide))
    return _made(word, over, low, high)


def _aligned(a: Value, b: Value) -> tuple[Expr, Expr, int, Value, Value]:
    """Numerators over one denominator in words of one width with two bits to spare, and the two values."""
    over = math.lcm(a.over, b.over)
    a, b = (Value(x.word, over, x.low, x.high) for x in (_raised(a, over), _raised(b, over)))
    wide = max(a.word.width, b.word.width) + 2
    return (
        e.sign_extend(a.word, wide - a.word.width),
        e.sign_extend(b.word, wide - b.word.width),
        over,
        a,
        b,
    )


def _raised(a: Value, over: int) -> Value:
    by = over // a.over
    return a if by == 1 else _scaled(Value(a.word, 1, a.low, a.high), by)


def _word(node: ast.expr, names: Mapping[str, Value]) -> Value:
    match node:
        case ast.Constant(value):
            return _number(Fraction(repr(value)))
        case ast.Name(name):
            return names[name]
        case ast.UnaryOp(ast.Not(), operand):
            return _bit(e.bvnot(e.nonzero(_word(operand, names).word)))
        case ast.UnaryOp(op, operand):
            inner = _word(operand, names)
            return _scaled(inner, -1) if isinstance(op, ast.USub) else inner
        case ast.BinOp(left, op, right):
            return _binary(BINARY[type(op)], _word(left, names), _word(right, names))
        case ast.BoolOp(op, parts):
            bits = [e.nonzero(_word(part, names).word) for part in parts]
            return _bit(e.disj(bits) if isinstance(op, ast.Or) else e.conj(bits))
        case ast.IfExp(test, body, orelse):
            return _either(e.nonzero(_word(test, names).word), _word(body, names), _word(orelse, names))
        case ast.Compare(left, ops, comparators):
            operands = [_word(x, names) for x in (left, *comparators)]
            pairs = zip(operands, ops, operands[1:], strict=False)
            return _bit(e.conj(_compared(COMPARED[type(op)], a, b) for a, op, b in pairs))
        case ast.Call(ast.Name(name), args, _):
            return _extreme(name, [_word(x, names) for x in args])
    raise NoWord("a part of a formula that is not known")


def _bit(bit: Expr) -> Value:
    return Value(e.zero_extend(bit, 1), 1, 0, 1)


def _either(bit: Expr, a: Value, b: Value) -> Value:
    x, y, over, a, b = _aligned(a, b)
    return _made(e.ite(bit, x, y), over, min(a.low, b.low), max(a.high, b.high))


def _extreme(name: str, values: Sequence[Value]) -> Value:
    found = values[0]
    for value in values[1:]:
        less = _compared("<", value, found)
        found = _either(less if name == "min" else e.bvnot(less), value, found)
    return found


def _compared(op: str, a: Value, b: Value) -> Expr:
    x, y, *_ = _aligned(a, b)
    match op:
        case "<":
            return e.bvslt(x, y)
        case "<=":
            return e.bvsle(x, y)
        case ">":
            return e.bvslt(y, x)
        case ">=":
            return e.bvsle(y, x)
        case "==":
            return e.eq(x, y)
    return e.bvnot(e.eq(x, y))


def _binary(op: str, a: Value, b: Value) -> Value:
    match op:
        case "+":
            x, y, over, a, b = _aligned(a, b)
            return _made(e.bvadd(x, y), over, a.low + b.low, a.high + b.high)
        case "-":
            x, y, over, a, b = _aligned(a, b)
            return _made(e.bvsub(x, y), over, a.low - b.high, a.high - b.low)
        case "*":
            return _product(a, b)
        case "/":
            return _divided(a, b)
        case "//" | "%":
            return _remainder(op, a, b)
    return _power(a, b)


def _product(a: Value, b: Value) -> Value:
    wide = a.word.width + b.word.width
    word = e.bvmul(e.sign_extend(a.word, wide - a.word.width), e.sign_extend(b.word, wide - b.word.width))
    ends = [x * y for x in (a.low, a.high) for y in (b.low, b.high)]
    return _made(word, a.over * b.over, min(ends), max(ends))


def _divided(a: Value, b: Value) -> Value:
    if b.low != b.high or b.low == 0:
        raise NoWord("a division by an input")
    by = Fraction(b.over, b.low)
    return _scaled(Value(a.word, a.over * by.denominator, a.low, a.high), by.numerator)


def _remainder(op: str, a: Value, b: Value) -> Value:
    if a.low < 0 or b.low <= 0:
        raise NoWord("a remainder of what may be negative, or by what may be 0")
    x, y, over, a, b = _aligned(a, b)
    if op == "//":
        return _made(e.binary("bvudiv", x, y), 1, a.low // b.high, a.high // b.low)
    return _made(e.binary("bvurem", x, y), over, 0, b.high)


def _power(a: Value, b: Value) -> Value:
    if b.over != 1 or b.low < 0 or b.high - b.low >= MOST_EXPONENTS or b.high > WIDEST:
        raise NoWord("a power with too many exponents")
    found = _raised_to(a, b.high)
    for exponent in range(b.high - 1, b.low - 1, -1):
        here = e.eq(b.word, e.const(exponent, b.word.width))
        found = _either(here, _raised_to(a, exponent), found)
    return found


def _raised_to(a: Value, exponent: int) -> Value:
    if a.low == a.high:
        return _number(Fraction(a.low, a.over) ** exponent)
    if exponent > 16:
        raise NoWord("a high power of an input")
    found = _number(Fraction(1))
    for _ in range(exponent):
        found = _product(found, a)
    return found
