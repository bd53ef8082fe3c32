"""Expressions: the four evaluations against one another, simplification against plain arithmetic, SMT-LIB's facts."""

from __future__ import annotations

import random
from collections.abc import Sequence

import numpy as np
import pytest
import z3
from machines import random_expression

from prover import expr as e
from prover.errors import InternalError

LEAVES = [e.var("a", 1), e.var("b", 4), e.var("c", 7), e.var("d", 33)]


@pytest.mark.parametrize("seed", range(60))
def test_the_four_evaluations_agree(seed: int) -> None:
    rng = random.Random(seed)
    root = random_expression(rng, LEAVES, rng.randint(1, 12), 5)
    samples = [{v.name: rng.getrandbits(v.width) for v in LEAVES} for _ in range(12)]
    by_walk = [e.evaluate([root], values)[0] for values in samples]
    step = e.compile_step([root], [v.name for v in LEAVES])
    assert [step(*values.values())[0] for values in samples] == by_walk
    columns = {v.name: np.array([s[v.name] for s in samples], dtype=np.uint64) for v in LEAVES}
    (array,) = e.arrays([root], columns)
    assert list(np.broadcast_to(array, len(samples))) == by_walk
    _solver_agrees(root, samples, by_walk)


@pytest.mark.parametrize("seed", range(40))
def test_arrays_of_words_too_wide_for_numpy_agree(seed: int) -> None:
    """Over and around 64 bits, where signs and shifts have their corners."""
    rng = random.Random(2000 + seed)
    root = random_expression(rng, LEAVES, rng.choice([63, 64, 65, 80, 129]), 4)
    samples = [{v.name: rng.choice([0, rng.getrandbits(v.width), (1 << v.width) - 1]) for v in LEAVES}]
    samples += [{v.name: rng.getrandbits(v.width) for v in LEAVES} for _ in range(7)]
    by_walk = [e.evaluate([root], values)[0] for values in samples]
    columns = {v.name: np.array([s[v.name] for s in samples], dtype=np.uint64) for v in LEAVES}
    # What goes beyond a word somewhere inside is as wide as that everywhere.
    bit = e.extract(e.concat(root, e.resize(root, 70, True)), 0, 0)
    array, low = e.arrays([root, bit], columns)
    assert [int(value) for value in np.broadcast_to(array, len(samples))] == by_walk
    assert [int(value) for value in np.broadcast_to(low, len(samples))] == [value & 1 for value in by_walk]
    _solver_agrees(root, samples, by_walk)


def _solver_agrees(root: e.Expr, samples: Sequence[dict[str, int]], by_walk: Sequence[int]) -> None:
    (term,) = e.z3_terms([root])
    for values, wanted in zip(samples, by_walk, strict=True):
        pairs = [(z3.BitVec(v.name, v.width), z3.BitVecVal(values[v.name], v.width)) for v in LEAVES]
        assert z3.simplify(z3.substitute(term, *pairs)).as_long() == wanted


@pytest.mark.parametrize("seed", range(40))
def test_smtlib_text_means_the_same_to_the_solver(seed: int) -> None:
    rng = random.Random(1000 + seed)
    root = random_expression(rng, LEAVES, 6, 4)
    values = {v.name: rng.getrandbits(v.width) for v in LEAVES}
    wanted = e.const(e.evaluate([root], values)[0], 6)
    fixed = e.conj(e.eq(v, e.const(values[v.name], v.width)) for v in LEAVES)
    for goal, answer in ((e.eq(root, wanted), z3.sat), (e.bvnot(e.eq(root, wanted)), z3.unsat)):
        solver = z3.Solver()
        solver.from_string(e.smtlib(e.bvand(fixed, goal)))
        assert solver.check() == answer


def test_division_by_zero_is_smtlibs() -> None:
    # SMT-LIB FixedSizeBitVectors theory: bvudiv by zero is all ones, bvurem by zero the dividend.
    x, zero = e.const(9, 4), e.const(0, 4)
    assert e.binary("bvudiv", x, zero) is e.const(15, 4)
    assert e.binary("bvurem", x, zero) is x


def test_equal_expressions_are_one_object_and_text_is_stable() -> None:
    b = e.var("b", 4)
    one = e.ite(e.eq(b, e.const(9, 4)), e.const(0, 4), e.bvadd(b, e.const(1, 4)))
    two = e.ite(e.eq(b, e.const(9, 4)), e.const(0, 4), e.bvadd(b, e.const(1, 4)))
    assert one is two
    assert str(one) == "(ite (eq b 4'd9) 4'd0 (bvadd b 4'd1))"


def test_expressions_deeper_than_the_stack_are_walked() -> None:
    root = e.var("b", 4)
    for i in range(20_000):
        root = e.bvxor(e.bvadd(root, e.const(3, 4)), e.const(i % 7 + 1, 4))
    value = 5
    for i in range(20_000):
        value = ((value + 3) & 15) ^ (i % 7 + 1)
    assert e.evaluate([root], {"b": 5}) == [value]


def test_a_width_that_does_not_fit_is_our_fault() -> None:
    with pytest.raises(InternalError):
        e.bvand(e.var("a", 1), e.var("b", 4))
    with pytest.raises(InternalError):
        e.extract(e.var("b", 4), 4, 0)
