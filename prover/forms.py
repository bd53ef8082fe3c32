"""Numbers that depend on the inputs of --each: polynomials in the inputs, shifted right by constants.

A state's component, the number of rounds of a repeat, a length in half-cycles and a claimed ratio are all of this
kind: exact as polynomials, and as words over variables of the inputs' names wherever a solver is to be asked.
"""

from __future__ import annotations

import ast
from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass
from fractions import Fraction
from functools import reduce
from math import floor, lcm, prod

from prover import expr as e
from prover import formula as language
from prover.expr import Expr
from prover.formula import Formula

Atom = tuple[str, int, int]
"""An input's name, its width, and by how much it is shifted right."""

Monomial = tuple[Atom, ...]


MOST_POWER = 16
"""Powers of an input that are written out."""


class Beyond(Exception):
    """What can't be written as a polynomial; the message says what it is."""


@dataclass(frozen=True, slots=True)
class Poly:
    """A sum of products: each monomial, its atoms in order, with a coefficient that is not 0."""

    terms: tuple[tuple[Monomial, Fraction], ...]

    @staticmethod
    def of(terms: Mapping[Monomial, Fraction]) -> Poly:
        """The polynomial with these coefficients."""
        return Poly(tuple(sorted((m, c) for m, c in terms.items() if c)))

    @staticmethod
    def const(value: int | Fraction) -> Poly:
        """A constant."""
        return Poly.of({(): Fraction(value)})

    @staticmethod
    def atom(name: str, width: int, shift: int = 0) -> Poly:
        """An input, shifted right."""
        return Poly((((((name, width, shift)),), Fraction(1)),))

    def __add__(self, other: Poly) -> Poly:
        terms = dict(self.terms)
        for monomial, coefficient in other.terms:
            terms[monomial] = terms.get(monomial, Fraction(0)) + coefficient
        return Poly.of(terms)

    def __neg__(self) -> Poly:
        return Poly(tuple((m, -c) for m, c in self.terms))

    def __sub__(self, other: Poly) -> Poly:
        return self + -other

    def __mul__(self, other: Poly) -> Poly:
        terms: dict[Monomial, Fraction] = {}
        for a, x in self.terms:
            for b, y in other.terms:
                monomial = tuple(sorted((*a, *b)))
                terms[monomial] = terms.get(monomial, Fraction(0)) + x * y
        return Poly.of(terms)

    @property
    def constant(self) -> Fraction | None:
        """The value, if it is the same for all inputs."""
        if not self.terms:
            return Fraction(0)
        return self.terms[0][1] if len(self.terms) == 1 and not self.terms[0][0] else None

    @property
    def whole(self) -> bool:
        """Whether all coefficients are whole numbers."""
        return all(c.denominator == 1 for _, c in self.terms)

    def value(self, values: Mapping[str, int]) -> Fraction:
        """The value where the inputs have these values."""
        total = Fraction(0)
        for monomial, coefficient in self.terms:
            total += coefficient * prod(values[name] >> shift for name, _, shift in monomial)
        return total

    def number(self, values: Mapping[str, int]) -> int:
        """The same, as the whole number that it has to be."""
        value = self.value(values)
        if value.denominator != 1:
            raise ValueError(f"{self} is no whole number")
        return int(value)

    def reduced(self, width: int) -> Poly:
        """The same mod 2^width: coefficients from 0 on, or −1 where that is shorter."""
        size = 1 << width
        terms = {m: int(c) % size for m, c in self.terms}
        return Poly.of({m: Fraction(c - size if m and c > size >> 1 else c) for m, c in terms.items()})

    def word(self, width: int) -> Expr:
        """The value mod 2^width, for whole coefficients."""
        total = e.const(0, width)
        for monomial, coefficient in self.terms:
            if coefficient.denominator != 1:
                raise ValueError(f"{self} is no whole number")
            part = e.const(int(coefficient), width)
            for name, size, shift in monomial:
                atom = e.extract(e.var(name, size), size - 1, shift) if shift < size else e.const(0, 1)
                part = e.bvmul(e.resize(atom, width, False), part)
            total = e.bvadd(part, total)
        return total

    @property
    def size(self) -> int:
        """Bits of a signed word that holds the value, whatever the inputs are."""
        most = sum(abs(c) * prod(1 << max(w - s, 0) for _, w, s in m) for m, c in self.terms)
        return floor(most).bit_length() + 2

    def __str__(self) -> str:
        if not self.terms:
            return "0"
        parts = []
        for monomial, coefficient in sorted(self.terms, key=lambda term: (len(term[0]), term), reverse=True):
            names = "*".join(name if not shift else f"({name}//{1 << shift})" for name, _, shift in monomial)
            if not monomial or abs(coefficient) != 1:
                names = f"{abs(coefficient)}*{names}" if names else str(abs(coefficient))
            parts.append(("-" if coefficient < 0 else "+", names))
        first = ("-" if parts[0][0] == "-" else "") + parts[0][1]
        return first + "".join(f" {sign} {text}" for sign, text in parts[1:])


ZERO, ONE = Poly.const(0), Poly.const(1)


def total(parts: Iterable[Poly]) -> Poly:
    """The sum of the parts."""
    return reduce(Poly.__add__, parts, ZERO)


def at_least(a: Poly, b: Poly) -> Expr:
    """One bit: a ≥ b."""
    difference = _whole(a - b)
    value = difference.constant
    if value is not None:
        return e.TRUE if value >= 0 else e.FALSE
    size = difference.size
    return e.bvnot(e.bvslt(difference.word(size), e.const(0, size)))


def equal(a: Poly, b: Poly) -> Expr:
    """One bit: a = b. Equal polynomials are, without a question to anyone."""
    difference = _whole(a - b)
    value = difference.constant
    if value is not None:
        return e.TRUE if value == 0 else e.FALSE
    size = difference.size
    return e.eq(difference.word(size), e.const(0, size))


def _whole(a: Poly) -> Poly:
    """A positive multiple with whole coefficients."""
    return a * Poly.const(lcm(*(c.denominator for _, c in a.terms)))


# -- formulas ----------------------------------------------------------------------------------------------

Decide = Callable[[Expr], bool]
"""Whether a condition on the inputs, one bit, holds for all of them or for none."""


def polynomial(formula: Formula, names: Mapping[str, Poly], decide: Decide) -> Poly:
    """The formula as a polynomial in what its names stand for; `decide` settles its conditions. Raises Beyond."""
    return _Reader(names, decide).number(formula.tree)


def condition(formula: Formula, names: Mapping[str, Poly]) -> Expr:
    """One bit: the formula is not 0. Raises Beyond where it is more than comparisons of polynomials."""

    def undecided(_: Expr) -> bool:
        raise Beyond("a condition within a condition")

    return _Reader(names, undecided).truth(formula.tree)


class _Reader:
    """A formula's tree as polynomials and conditions. It is no deeper than a formula is long."""

    def __init__(self, names: Mapping[str, Poly], decide: Decide) -> None:
        self.names = names
        self.decide = decide

    def settled(self, question: Expr) -> bool:
        return bool(question.value) if question.is_const else self.decide(question)

    def number(self, node: ast.expr) -> Poly:
        match node:
            case ast.Constant(value):
                return Poly.const(Fraction(repr(value)))
            case ast.Name(name):
                return self.names[name]
            case ast.UnaryOp(ast.USub(), operand):
                return -self.number(operand)
            case ast.UnaryOp(ast.UAdd(), operand):
                return self.number(operand)
            case ast.BinOp(left, op, right):
                return self.binary(language.BINARY[type(op)], self.number(left), self.number(right))
            case ast.IfExp(test, body, orelse):
                return self.number(body if self.settled(self.truth(test)) else orelse)
            case ast.Call(ast.Name(name), args, _):
                best = self.number(args[0])
                for arg in args[1:]:
                    other = self.number(arg)
                    greater = self.settled(at_least(best, other))
                    best = best if greater == (name == "max") else other
                return best
        return ONE if self.settled(self.truth(node)) else ZERO

    def truth(self, node: ast.expr) -> Expr:
        match node:
            case ast.UnaryOp(ast.Not(), operand):
                return e.bvnot(self.truth(operand))
            case ast.BoolOp(op, parts):
                made = [self.truth(part) for part in parts]
                return e.conj(made) if isinstance(op, ast.And) else e.disj(made)
            case ast.Compare(left, ops, comparators):
                operands = [self.number(x) for x in (left, *comparators)]
                pairs = zip(operands, ops, operands[1:], strict=False)
                return e.conj(_compared(language.COMPARED[type(op)], a, b) for a, op, b in pairs)
        return e.bvnot(equal(self.number(node), ZERO))

    def binary(self, op: str, a: Poly, b: Poly) -> Poly:
        if op in "+-*":
            return a + b if op == "+" else a - b if op == "-" else a * b
        by = b.constant
        if by is None or by == 0:
            raise Beyond(f"'{op}' by what is no constant")
        if op == "/":
            return a * Poly.const(1 / by)
        if op == "**":
            most = MOST_POWER if a.constant is None else language.MOST_BITS
            if by.denominator != 1 or not 0 <= by <= most or (a.constant or 0) > language.MOST_BITS:
                raise Beyond(f"a power of {by}")
            return reduce(Poly.__mul__, [a] * int(by), ONE)
        # Only where the rest is the same for all inputs is the quotient a polynomial.
        moving = Poly(tuple((m, c / by) for m, c in a.terms if m))
        if not moving.whole:
            raise Beyond(f"'{op} {by}' of what does not move in steps of {by}")
        rest = (a - moving * Poly.const(by)).constant or Fraction(0)
        return moving + Poly.const(rest // by) if op == "//" else Poly.const(rest % by)


def _compared(op: str, a: Poly, b: Poly) -> Expr:
    match op:
        case "<":
            return e.bvnot(at_least(a, b))
        case "<=":
            return at_least(b, a)
        case ">":
            return e.bvnot(at_least(b, a))
        case ">=":
            return at_least(a, b)
        case "==":
            return equal(a, b)
    return e.bvnot(equal(a, b))
