"""Polynomials in inputs: their arithmetic and their words against plain integers, formulas read as polynomials."""

from __future__ import annotations

import random
from fractions import Fraction

import pytest

from prover import expr as e
from prover import formula
from prover.forms import Beyond, Poly, at_least, condition, equal, polynomial

WIDTHS = {"a": 3, "b": 4}
ATOMS = [("a", 0), ("a", 1), ("b", 0), ("b", 2)]
ALL = [{"a": a, "b": b} for a in range(8) for b in range(16)]


def drawn(rng: random.Random) -> tuple[Poly, list[tuple[int, list[tuple[str, int]]]]]:
    """A polynomial, and the same as a list of products."""
    terms = []
    made = Poly.const(0)
    for _ in range(rng.randint(0, 4)):
        factor = rng.randint(-9, 9)
        names = [rng.choice(ATOMS) for _ in range(rng.randint(0, 2))]
        part = Poly.const(factor)
        for name, shift in names:
            part = part * Poly.atom(name, WIDTHS[name], shift)
        made = made + part
        terms.append((factor, names))
    return made, terms


def plain(terms: list[tuple[int, list[tuple[str, int]]]], values: dict[str, int]) -> int:
    total = 0
    for factor, names in terms:
        for name, shift in names:
            factor *= values[name] >> shift
        total += factor
    return total


@pytest.mark.parametrize("seed", range(30))
def test_a_polynomial_is_the_sum_it_was_made_of(seed: int) -> None:
    rng = random.Random(seed)
    (one, its), (two, others) = drawn(rng), drawn(rng)
    width = rng.randint(1, 9)
    words = [one.word(width), (one * two).word(width), one.reduced(width).word(width)]
    greater, same = at_least(one, two), equal(one, two)
    for values in ALL:
        x, y = plain(its, values), plain(others, values)
        assert one.value(values) == x
        assert (one + two).value(values) == x + y
        assert (one - two).value(values) == x - y
        assert (one * two).value(values) == x * y
        assert e.evaluate(words, values) == [x % 2**width, x * y % 2**width, x % 2**width]
        assert e.evaluate([greater, same], values) == [int(x >= y), int(x == y)]
        assert -(1 << one.size - 1) <= x < 1 << one.size - 1


@pytest.mark.parametrize(
    "text",
    [
        "2*(a+1)",
        "a*b - 3",
        "(a + 2*b)/2",
        "4*a + 6 - b**2",
        "(8*a + 5)//4",
        "(8*a + 5) % 4",
        "-a + +b",
        "a*a*a",
    ],
)
def test_a_formula_is_the_polynomial_that_it_says(text: str) -> None:
    said = formula.read(text, "--ratio")
    names = {name: Poly.atom(name, width) for name, width in WIDTHS.items()}
    made = polynomial(said, names, lambda question: pytest.fail("no condition in it"))
    assert all(made.value(values) == said.value(values) for values in ALL)


@pytest.mark.parametrize(
    "text", ["max(a, 3)", "min(a, b, 5)", "a if a > b else b + 1", "(a > 2) + 1", "2 if not a else a"]
)
def test_conditions_in_a_formula_are_settled_by_whoever_is_asked(text: str) -> None:
    said = formula.read(text, "--ratio")
    names = {name: Poly.atom(name, width) for name, width in WIDTHS.items()}
    for values in ALL:
        made = polynomial(said, names, lambda question: e.evaluate([question], values) == [1])  # noqa: B023
        assert made.value(values) == said.value(values)


@pytest.mark.parametrize(
    "text", ["a >= b", "a > 2 and b < 9", "not a == 3", "a*b != 6 or a", "1 < a <= b", "b >= a + 2"]
)
def test_a_condition_holds_where_the_formula_does(text: str) -> None:
    said = formula.read(text, "--where")
    names = {name: Poly.atom(name, width) for name, width in WIDTHS.items()}
    made = condition(said, names)
    assert all(e.evaluate([made], values) == [int(said.value(values) != 0)] for values in ALL)


@pytest.mark.parametrize("text", ["a // b", "a % 3", "a // 2", "1 / a", "2 ** a", "a ** 99"])
def test_what_is_no_polynomial_is_said_to_be_none(text: str) -> None:
    names = {name: Poly.atom(name, width) for name, width in WIDTHS.items()}
    with pytest.raises(Beyond):
        polynomial(formula.read(text, "--ratio"), names, lambda question: True)


def test_polynomials_read_as_people_write_them() -> None:
    a, b = Poly.atom("a", 3), Poly.atom("b", 4, 1)
    assert str(Poly.const(0)) == "0"
    assert str(Poly.const(4) - a * Poly.const(2)) == "-2*a + 4"
    assert str(a * b + Poly.const(Fraction(1, 2))) == "a*(b//2) + 1/2"
