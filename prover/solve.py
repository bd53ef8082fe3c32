"""One question: values that make a one-bit expression true, or the certainty that there are none.

Small questions are answered by trying everything, the others by an SMT solver for bit vectors."""

from __future__ import annotations

import itertools
import random
from collections.abc import Sequence
from typing import Any

from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.expr import Expr

Model = dict[str, int]


def fresh_solver() -> Any:
    """A solver in a context of its own (its `ctx`), so that what it finds hangs on nothing that was asked before:
    z3's choices follow the numbers that a context gives to terms."""
    import z3

    return z3.SolverFor("QF_BV", ctx=z3.Context())


TRIED = 10
"""Bits of variables up to which every assignment is tried: quicker than a solver's start."""


def find(goal: Expr, effort: Effort) -> Model | None:
    """Values of the goal's variables for which it is 1, or None if it can't be.

    Raises OutOfEffort when the solver gives up or the time is out.
    """
    if goal.is_const:
        return {} if goal.value else None
    effort.check()
    used = e.variables([goal])
    if sum(v.width for v in used) <= TRIED:
        return _tried(goal, used)
    import z3

    solver = fresh_solver()
    (term,) = e.z3_terms([goal], context=solver.ctx)
    solver.set("timeout", max(1, int(effort.left * 1000)))
    solver.add(term == 1)
    answer = solver.check()
    if answer == z3.unsat:
        return None
    if answer != z3.sat:
        raise OutOfEffort(f"the solver gave up while {effort.doing}")
    model = solver.model()
    values: Model = {}
    for v in e.variables([goal]):
        value: Any = model.eval(z3.BitVec(v.name, v.width, solver.ctx), model_completion=True)
        values[v.name] = value.as_long()
    if e.evaluate([goal], values) != [1]:
        raise InternalError("the solver's model does not satisfy the question")
    return values


def _tried(goal: Expr, used: Sequence[Expr]) -> Model | None:
    run = e.compile_step([goal], [v.name for v in used])
    for values in itertools.product(*(range(1 << v.width) for v in used)):
        if run(*values)[0]:
            return {v.name: value for v, value in zip(used, values, strict=True)}
    return None


def least(goal: Expr, inputs: Sequence[tuple[str, int]], effort: Effort) -> dict[str, int] | None:
    """The first value of the inputs, in their order, for which the goal can be fulfilled."""
    out: dict[str, int] = {}
    model = find(goal, effort)
    if model is None:
        return None
    for name, width in inputs:
        word = e.var(name, width)
        low, high = 0, model.get(name, 0)
        while low < high:
            middle = (low + high) // 2
            lower = find(e.bvand(goal, e.bvule(word, e.const(middle, width))), effort)
            if lower is None:
                low = middle + 1
            else:
                model, high = lower, lower.get(name, 0)
        out[name] = high
        goal = e.bvand(goal, e.eq(word, e.const(high, width)))
        model = find(goal, effort) or model
    return out


def constant(value: Expr) -> int | None:
    """The value that an expression always has, if there is one: by its form, else by samples and the solver."""
    if value.is_const:
        return value.value
    used = e.variables([value])
    rng = random.Random(0)
    samples = [{v.name: rng.getrandbits(v.width) for v in used} for _ in range(8)]
    seen = {e.evaluate([value], sample)[0] for sample in samples}
    if len(seen) > 1:
        return None
    (only,) = seen
    differs = e.bvnot(e.eq(value, e.const(only, value.width)))
    return only if find(differs, Effort(5)) is None else None
