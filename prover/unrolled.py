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
from prover.watch import FIRST, Watch

DEEPEST = 200
"""Half-cycles that are unrolled."""


@dataclass(frozen=True, slots=True)
class Broken:
    """A run that breaks the claim.

    begin    which of the beginnings
    given    values of the inputs at the start, of rigid inputs and of free variables, by name
    moves    values of the moves in each half-cycle, the first one's after the start
    """

    begin: int
    given: Mapping[str, int]
    moves: tuple[Mapping[str, int], ...]


@dataclass(frozen=True, slots=True)
class Looked:
    """What came of it: a run, or the half-cycles within which no run breaks the claim."""

    broken: Broken | None
    covered: int


def shortest(system: Watch, effort: Effort, deepest: int = DEEPEST) -> Looked:
    """Unroll until a run breaks the claim, the depth is reached or the effort runs out. Where values that x stands
    for decide, they are 0: a run of theirs could not be replayed."""
    import z3

    chains = [_Chain(system, number) for number in range(len(system.begins))]
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

    def __init__(self, system: Watch, number: int) -> None:
        import z3

        self.system, self.number, self.depth = system, number, 0
        self.solver: Any = z3.SolverFor("QF_BV")
        self.memo: dict[e.Expr, Any] = {}
        values, given = system.begins[number]
        self.state: Sequence[e.Expr] = values
        self.given = given
        self._add(given)

    def _add(self, condition: e.Expr) -> None:
        (term,) = e.z3_terms([condition], self.memo)
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
        (term,) = e.z3_terms([broken], self.memo)
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
            found: Any = model.eval(z3.BitVec(name, width), model_completion=True)
            return int(found.as_long())

        machine = self.system.machine
        begin = machine.begins[self.number]
        given = {name: value(name, width) for name, width in (*machine.rigid, *begin.free)}
        first = {name: value(name, width) for name, width in machine.moving}
        given |= {name: value(FIRST + name, width) for name, width in machine.moving}
        steps = [
            {name: value(f"{name}@{depth}", width) for name, width in self.system.moves}
            for depth in range(self.depth + 1)
        ]
        return Broken(self.number, given, (first, *steps))
