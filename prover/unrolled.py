"""The shortest run that breaks a claim about moving inputs, by unrolling (bounded model checking: Biere, Cimatti,
Clarke and Zhu 1999).

The steps of a watch are strung together one at a time, with new moves in each, and a solver that keeps what it has
learnt is asked whether the last one can break the claim. The first that can is a shortest run from its beginning.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from prover import expr as e
from prover.effort import Effort
from prover.solve import fresh_solver
from prover.watch import FIRST, Seed, Watch

DEEPEST = 200
"""Half-cycles that are unrolled."""


@dataclass(frozen=True, slots=True)
class Broken:
    """A run that breaks the claim.

    begin    which of the beginnings, or a place on an orbit
    given    values of the inputs at the start, of rigid inputs and of free variables, by name
    moves    values of the moves in each half-cycle, the first one's after the start
    """

    begin: int | Seed
    given: Mapping[str, int]
    moves: tuple[Mapping[str, int], ...]


@dataclass(frozen=True, slots=True)
class Looked:
    """What came of it: a run, or the half-cycles within which no run breaks the claim."""

    broken: Broken | None
    covered: int


def shortest(
    system: Watch, effort: Effort, deepest: int = DEEPEST, seeds: Sequence[Seed] | None = None
) -> Looked:
    """Unroll until a run breaks the claim, the depth is reached or the effort runs out: from all beginnings, or from
    the seeds where these are given. Where values that x stands for decide, they are 0: a run of theirs could not be
    replayed."""
    import z3

    chains = [_Chain(system, begin) for begin in (range(len(system.begins)) if seeds is None else seeds)]
    depth = 0
    for depth in range(deepest):
        effort.doing = f"unrolling {depth + 1} half-cycles"
        for chain in chains:
            if effort.left <= 0:
                return Looked(None, depth)
            answer = chain.breaks(effort)
            if answer == z3.sat:
                return Looked(chain.run(), depth + 1)
            if answer != z3.unsat:
                return Looked(None, depth)
        for chain in chains:
            chain.onward()
    return Looked(None, depth + 1)


class _Chain:
    """The steps from one beginning so far."""

    def __init__(self, system: Watch, begin: int | Seed) -> None:
        self.system, self.begin, self.depth = system, begin, 0
        self.solver: Any = fresh_solver()
        self.memo: dict[e.Expr, Any] = {}
        if isinstance(begin, Seed):
            # The pulse there is not seen to begin: what breaks the claim has to begin later.
            at = {**begin.registers, **begin.inputs}
            self.state: Sequence[e.Expr] = [
                e.const(at.get(name, 0), width) for name, width in system.variables
            ]
        else:
            zeros = {name: e.const(0, width) for name, width in system.machine.choices}
            values, given = system.begins[begin]
            *self.state, given = e.substitute([*values, given], zeros)
            self._add(given)

    def _add(self, condition: e.Expr) -> None:
        (term,) = e.z3_terms([condition], self.memo, self.solver.ctx)
        self.solver.add(term == 1)

    def _now(self, wanted: Sequence[e.Expr]) -> list[e.Expr]:
        """Expressions over variables and moves in the next step, over the start and all moves."""
        values = dict(zip(self.system.names, self.state, strict=True))
        values |= {name: e.var(f"{name}@{self.depth}", width) for name, width in self.system.moves}
        values |= {n: e.const(0, w) for n, w in self.system.machine.choices}
        return e.substitute(wanted, values)

    def breaks(self, effort: Effort) -> Any:
        """Whether the next step can break the claim."""
        allowed, broken = self._now([self.system.allowed, self.system.broken])
        self._add(allowed)
        (term,) = e.z3_terms([broken], self.memo, self.solver.ctx)
        self.solver.set("timeout", max(1, int(effort.left * 1000)))
        return self.solver.check(term == 1)

    def onward(self) -> None:
        self.state = self._now(self.system.step)
        self.depth += 1

    def run(self) -> Broken:
        """The run that the solver has found."""
        import z3

        model = self.solver.model()

        def value(name: str, width: int) -> int:
            found: Any = model.eval(z3.BitVec(name, width, self.solver.ctx), model_completion=True)
            return int(found.as_long())

        machine = self.system.machine
        steps = [
            {name: value(f"{name}@{depth}", width) for name, width in self.system.moves}
            for depth in range(self.depth + 1)
        ]
        if isinstance(self.begin, Seed):
            return Broken(self.begin, self.begin.inputs, (self.begin.inputs, *steps))
        free = machine.begins[self.begin].free
        given = {name: value(name, width) for name, width in (*machine.rigid, *free)}
        first = {name: value(name, width) for name, width in machine.moving}
        given |= {name: value(FIRST + name, width) for name, width in machine.moving}
        return Broken(self.begin, given, (first, *steps))
