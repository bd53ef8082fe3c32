"""One question to the solver: values that make a one-bit expression true, or the certainty that there are none."""

from __future__ import annotations

import random
from typing import Any

from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.expr import Expr

Model = dict[str, int]


def find(goal: Expr, effort: Effort) -> Model | None:
    """Values of the goal's variables for which it is 1, or None if it can't be.

    Raises OutOfEffort when the solver gives up or the time is out.
    """
    if goal.is_const:
        return {} if goal.value else None
    import z3

    effort.check()
    (term,) = e.z3_terms([goal])
    solver = z3.SolverFor("QF_BV")
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
        value: Any = model.eval(z3.BitVec(v.name, v.width), model_completion=True)
        values[v.name] = value.as_long()
    if e.evaluate([goal], values) != [1]:
        raise InternalError("the solver's model does not satisfy the question")
    return values


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
