"""Formulas as words: the same numbers as the fractions of `formula`, for every value of the inputs."""

from __future__ import annotations

import itertools

import pytest

from prover import expr as e
from prover import formula, nominal

WIDTHS = {"div": 4, "sel": 1}


@pytest.mark.parametrize(
    "text",
    [
        "2*(div+1)",
        "div/2",
        "2.5*div",
        "2**(div+1)",
        "3**sel+div",
        "div//3+1",
        "div%3+1",
        "20-div",
        "(3+2*sel)*div",
        "5 if sel else div",
        "min(div, 9)+max(sel, 2)",
        "div*sel if div > 3 and sel == 1 or div < 1 else 4",
        "not sel",
        "-(div-16)",
        # No words, but tables.
        "2+div/(sel+1)",
        "(div-20)//-3",
    ],
)
def test_a_word_is_what_the_formula_is(text: str) -> None:
    given = formula.read(text, "--ratio")
    inputs = {name: width for name, width in WIDTHS.items() if name in given.names}
    ends = {name: (0, (1 << width) - 1) for name, width in inputs.items()}
    word = nominal.whole(given, 2, inputs, ends, {})
    holds = nominal.condition(given, inputs, ends, {})
    seen = 0
    for values in itertools.product(*(range(1 << width) for width in inputs.values())):
        at = dict(zip(inputs, values, strict=True))
        value = given.value(at)
        assert e.evaluate([holds], at) == [int(value != 0)]
        if (2 * value).denominator == 1:
            assert e.evaluate([word], at) == [2 * value]
            seen += 1
    assert seen


def test_what_is_too_large_for_a_table_is_refused() -> None:
    given = formula.read("wide/(div+1)", "--ratio")
    with pytest.raises(nominal.NoWord):
        nominal.whole(given, 2, {"wide": 20, "div": 4}, {"wide": (0, (1 << 20) - 1), "div": (0, 15)}, {})


def test_an_exponent_may_not_be_without_measure() -> None:
    given = formula.read("2**wide", "--ratio")
    with pytest.raises(nominal.NoWord):
        nominal.whole(given, 2, {"wide": 20}, {"wide": (0, (1 << 20) - 1)}, {})
