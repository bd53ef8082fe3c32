"""The clausal road: circuits compute what expressions mean, and proofs taken apart follow step by step.

That the verified checker accepts them is tested in tests/agreement, where it is installed."""

from __future__ import annotations

import itertools
import random
from collections.abc import Sequence

import pytest
from machines import random_expression
from pysat.solvers import Solver

from prover import clausal, rup
from prover import expr as e
from prover.expr import Expr

LEAVES = [e.var("a", 5), e.var("b", 3), e.var("c", 1)]


def has_division(root: Expr) -> bool:
    return any(node.op in ("bvudiv", "bvurem", "bvsdiv", "bvsrem") for node in e.topological([root]))


def test_circuits_compute_what_expressions_evaluate_to() -> None:
    """The values come from `expr.evaluate`, which other tests hold against z3; each input is tried as assumptions, and
    the goal is fulfilled by it iff its value is 1."""
    rng = random.Random(1)
    tried = 0
    operators: set[str] = set()
    while tried < 1500:
        root = random_expression(rng, LEAVES, rng.randint(1, 7), 4)
        if has_division(root):
            continue
        values = {leaf.name: rng.getrandbits(leaf.width) for leaf in LEAVES}
        (value,) = e.evaluate([root], values)
        for wanted in (value, value ^ 1 << rng.randrange(root.width)):
            made = clausal.clauses_of(e.eq(root, e.const(wanted, root.width)))
            given = [
                bit if values[name] >> i & 1 else -bit
                for name, bits in made.inputs.items()
                for i, bit in enumerate(bits)
            ]
            with Solver(name=clausal.SOLVER, bootstrap_with=made.clauses) as solver:
                assert solver.solve(assumptions=given) == (wanted == value), e.text(root)
        operators |= {node.op for node in e.topological([root])}
        tried += 1
    circuits = set(e.OPERATORS) - {"bvudiv", "bvurem", "bvsdiv", "bvsrem"}
    assert circuits <= operators


@pytest.mark.parametrize("op", ["bvshl", "bvlshr", "bvashr"])
def test_shifts_by_any_amount_are_exhaustively_right(op: str) -> None:
    # Five bits are shifted by up to 31, far beyond the width.
    word, by = e.var("word", 5), e.var("by", 5)
    made = clausal.clauses_of(e.eq(e.binary(op, word, by), e.var("out", 5)))
    with Solver(name=clausal.SOLVER, bootstrap_with=made.clauses) as solver:
        for x, y in itertools.product(range(32), repeat=2):
            (out,) = e.evaluate([e.binary(op, word, by)], {"word": x, "by": y})
            for claimed in (out, out ^ 4):
                values = {"word": x, "by": y, "out": claimed}
                given = [
                    b if values[n] >> i & 1 else -b for n, bs in made.inputs.items() for i, b in enumerate(bs)
                ]
                assert solver.solve(assumptions=given) == (claimed == out)


def test_division_is_refused_by_name() -> None:
    goal = e.eq(e.binary("bvurem", e.var("a", 4), e.var("b", 4)), e.const(0, 4))
    with pytest.raises(clausal.Unsupported, match="bvurem"):
        clausal.clauses_of(goal)


def lemmas_of(clauses: list[list[int]]) -> list[tuple[int, ...]]:
    with Solver(name=clausal.SOLVER, bootstrap_with=clauses, with_proof=True) as solver:
        assert not solver.solve()
        lines = [line.split() for line in solver.get_proof() if not line.startswith("d")]
    return [tuple(map(int, line[:-1])) for line in lines]


def implied(premises: Sequence[tuple[int, ...]], lemma: tuple[int, ...]) -> bool:
    """Whether every assignment that fulfils the premises fulfils the lemma: all of them are tried."""
    names = sorted({abs(literal) for clause in (*premises, lemma) for literal in clause})
    for values in itertools.product((False, True), repeat=len(names)):
        true = {name if value else -name for name, value in zip(names, values, strict=True)}
        if all(true & set(clause) for clause in premises) and not true & set(lemma):
            return False
    return True


def test_each_step_follows_from_its_premises_and_the_last_is_empty() -> None:
    a, b = e.var("a", 3), e.var("b", 3)
    # (a + b)·(a + b) = a·a + 2·a·b + b·b, which takes a search to refute the opposite of.
    square = e.bvmul(e.bvadd(a, b), e.bvadd(a, b))
    parts = [e.bvmul(a, a), e.bvmul(e.bvmul(a, b), e.const(2, 3)), e.bvmul(b, b)]
    goal = e.bvnot(e.eq(square, e.bvadd(e.bvadd(parts[0], parts[1]), parts[2])))
    made = clausal.clauses_of(goal)
    clauses = [tuple(clause) for clause in made.clauses]
    lemmas = lemmas_of(made.clauses)
    steps = rup.needed_steps(clauses, lemmas)
    assert steps is not None
    assert len(steps) > 10
    assert steps[-1].lemma == ()
    known = set(clauses)
    tried = 0
    for step in steps:
        assert known.issuperset(step.premises)
        if len({abs(literal) for clause in step.premises for literal in clause}) <= 12:
            assert implied(step.premises, step.lemma)
            tried += 1
        known.add(step.lemma)
    assert tried > 10
    assert sum(not step.lemma for step in steps) == 1


def test_long_steps_are_taken_in_portions() -> None:
    # A chain of 500 implications that ends in a contradiction, wherever it is entered.
    clauses = [(1,), *((-i, i + 1) for i in range(1, 500)), (-500, -250, -3)]
    steps = rup.needed_steps(clauses, [()])
    assert steps is not None
    assert len(steps) > 10
    assert max(len(step.premises) for step in steps) <= 2 * rup.PORTION
    known = set(clauses)
    for step in steps:
        assert known.issuperset(step.premises)
        assert propagates(step.premises, step.lemma)
        known.add(step.lemma)
    assert steps[-1].lemma == ()


def propagates(premises: Sequence[tuple[int, ...]], lemma: tuple[int, ...]) -> bool:
    """Whether the premises and the lemma's negation lead to a contradiction by unit propagation, done plainly."""
    true = {-literal for literal in lemma}
    while True:
        left = [[x for x in clause if -x not in true] for clause in premises if not true & set(clause)]
        if [] in left or any(-x in true for x in true):
            return True
        units = {clause[0] for clause in left if len(clause) == 1}
        if not units:
            return False
        true |= units


def test_a_proof_with_a_lemma_that_does_not_follow_is_none() -> None:
    clauses = [(1, 2), (-1, 2), (1, -2), (-1, -2)]
    assert rup.needed_steps(clauses, [(2,), ()]) is not None
    # A lemma over a variable of its own does not follow, and what is left of the clauses is fulfilled by 1 and 2.
    assert rup.needed_steps(clauses[:3], [(2,), ()]) is None
    assert rup.needed_steps([(1, 2)], [(3,), ()]) is None
    assert rup.needed_steps(clauses, [(2,)]) is None
