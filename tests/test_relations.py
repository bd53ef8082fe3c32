"""Relations between two dividers that are too many states to be listed: found, and checked by code that shares
nothing with the search."""

from __future__ import annotations

import pytest
from small import CLOCK, design, flop

from prover import equality, relations
from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.expr import Expr
from prover.joint import Joint, build
from prover.pair import Pairing, match

RESET, ENABLE = e.var("rst", 1), e.var("en", 1)
PORTS = ("clk", "rst", "en")


def counted(name: str, width: int, following: Expr) -> tuple[str, int, Expr]:
    """A register that takes what follows while it is enabled, and 0 in reset."""
    held = e.var(name, width)
    return name, width, e.ite(RESET, e.const(0, width), e.ite(ENABLE, following, held))


def made(registers: list[tuple[str, int, Expr]], output: Expr) -> Design:
    return design([flop(name, width, CLOCK, data) for name, width, data in registers], output, PORTS)


def plus_one(word: Expr) -> Expr:
    return e.bvadd(word, e.const(1, word.width))


def binary(width: int) -> Design:
    count = e.var("count", width)
    return made([counted("count", width, plus_one(count))], e.extract(count, width - 1, width - 1))


def gray(width: int) -> Design:
    code = e.var("code", width)
    bits = [e.extract(code, width - 1, width - 1)]
    for i in reversed(range(width - 1)):
        bits.append(e.bvxor(bits[-1], e.extract(code, i, i)))
    following = plus_one(e.concat_all(bits))
    coded = e.bvxor(following, e.binary("bvlshr", following, e.const(1, width)))
    return made([counted("code", width, coded)], e.extract(code, width - 1, width - 1))


def decimal(digits: int) -> Design:
    """Decades, each counting when all before it wrap, and a toggle behind them."""
    wraps, registers = e.TRUE, []
    for i in range(digits):
        digit = e.var(f"digit{i}", 4)
        nine = e.eq(digit, e.const(9, 4))
        following = e.ite(wraps, e.ite(nine, e.const(0, 4), plus_one(digit)), digit)
        registers.append(counted(f"digit{i}", 4, following))
        wraps = e.bvand(wraps, nine)
    tick = e.var("tick", 1)
    registers.append(counted("tick", 1, e.ite(wraps, e.bvnot(tick), tick)))
    return made(registers, tick)


def modulo(width: int, last: int) -> Design:
    count = e.var("count", width)
    following = e.ite(e.eq(count, e.const(last, width)), e.const(0, width), plus_one(count))
    return made([counted("count", width, following)], e.bvule(e.const((last + 1) // 2, width), count))


def prescaled(width: int) -> Design:
    """A twisted ring of four, and a counter that moves once round it."""
    ring, count = e.var("ring", 4), e.var("count", width)
    turned = e.concat(e.extract(ring, 2, 0), e.bvnot(e.extract(ring, 3, 3)))
    ends = e.eq(ring, e.const(8, 4))
    return made(
        [counted("ring", 4, turned), counted("count", width, e.ite(ends, plus_one(count), count))],
        e.extract(count, width - 1, width - 1),
    )


def together(old: Design, new: Design) -> Joint:
    return build(match(old, new, Pairing(moving=("en",))), 0, Effort(60))


PAIRS = {
    "gray code": (binary(14), gray(14)),
    "decades": (decimal(3), modulo(11, 1999)),
    "ring before a counter": (prescaled(20), binary(23)),
}


@pytest.mark.parametrize("name", PAIRS)
def test_relations_between_codes_are_found_and_hold(name: str) -> None:
    joint = together(*PAIRS[name])
    claim = relations.invariant(joint, Effort(60))
    assert claim is not None
    assert equality.invariant_faults(joint, claim, Effort(60)) == []
    # The relations speak of both: without them the outputs need not agree.
    assert equality.invariant_faults(joint, equality.Invariant((), 1), Effort(60))


@pytest.mark.parametrize("depth", [2, 3])
def test_an_induction_that_looks_back_further_is_checked_as_such(
    depth: int, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(relations, "DEPTHS", (depth,))
    joint = together(decimal(2), modulo(8, 199))
    claim = relations.invariant(joint, Effort(60))
    assert claim is not None
    assert claim.depth == depth
    assert equality.invariant_faults(joint, claim, Effort(60)) == []


def test_what_differs_far_from_the_start_has_no_relations(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(relations, "DEPTHS", (1, 2))
    # By hand: the toggle turns after 100 counts and again after 100, the other output after 99 and 100.
    joint = together(decimal(2), modulo(8, 198))
    assert relations.invariant(joint, Effort(60)) is None
