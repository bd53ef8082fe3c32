"""The largest inductive subset of candidate lines (Houdini: Flanagan and Leino, FME 2001), and what of it is needed.

All candidates are assumed before a step; whatever a counterexample breaks after it is dropped, until there is none.
The order does not matter: there is one largest subset. If under it nothing is broken, the claim is proved.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.solve import find, fresh_solver
from prover.watch import Line, Watch

SOON = 2000
"""Milliseconds for a question whose answer only makes a proof shorter."""


def proof(system: Watch, lines: Sequence[Line], effort: Effort) -> tuple[Line, ...] | None:
    """Lines from which the claim follows, or None where the candidates do not suffice."""
    effort.say(f"pruning {len(lines)} candidates for invariants")
    asked = _Steps(system, _at_begins(system, lines, effort), effort)
    left = asked.largest()
    if find(e.conj([*asked.before(left), system.allowed, system.broken]), effort) is not None:
        return None
    return tuple(asked.lines[i] for i in left)


def shortened(system: Watch, lines: Sequence[Line], effort: Effort) -> tuple[Line, ...]:
    """Of lines from which a claim follows those that it takes, as far as that is found out soon."""
    asked = _Steps(system, lines, effort)
    return tuple(lines[i] for i in asked.needed(range(len(lines))))


def _at_begins(system: Watch, lines: Sequence[Line], effort: Effort) -> list[Line]:
    """The lines that hold wherever runs begin."""
    widths = dict(system.variables)
    left = list(lines)
    for values, given in system.begins:
        there = dict(zip(system.names, values, strict=True))
        parts = dict(zip(left, e.substitute([line.expr(widths) for line in left], there), strict=True))
        while True:
            model = find(e.bvand(given, e.bvnot(e.conj(parts[line] for line in left))), effort)
            if model is None:
                break
            full = {v.name: 0 for v in e.variables([given, *parts.values()])} | model
            kept = dict(zip(left, e.evaluate([parts[line] for line in left], full), strict=True))
            left = [line for line in left if kept[line]]
    return left


class _Steps:
    """Questions about one step from where lines hold."""

    def __init__(self, system: Watch, lines: Sequence[Line], effort: Effort) -> None:
        self.system, self.effort, self.lines = system, effort, lines
        widths = dict(system.variables)
        self.now = [line.expr(widths) for line in lines]
        self.then = e.substitute(self.now, dict(zip(system.names, system.step, strict=True)))
        self.inputs = [name for name, _ in (*system.variables, *system.moves, *system.machine.choices)]
        self.evaluate = e.compile_step(self.then, self.inputs)

    def before(self, left: Sequence[int]) -> list[Expr]:
        """What is assumed before a step."""
        return [self.system.within, *(self.now[i] for i in left)]

    def largest(self) -> list[int]:
        """The largest subset of the lines that every step keeps, by number."""
        asker = _Asker([self.system.within, self.system.allowed], self.now, self.then, self.effort)
        left = list(range(len(self.lines)))
        while True:
            asked = list(left)
            for number in asked:
                # A line at a time: one question about all of them together is far harder than all about one.
                if number not in left:
                    continue
                model = asker.broken(number, left)
                if model is not None:
                    holds = self.evaluate(*(model.get(name, 0) for name in self.inputs))
                    left = [i for i in left if holds[i]]
            if left == asked:
                return left

    def needed(self, left: Sequence[int]) -> list[int]:
        """Of an inductive set those lines that it takes: for nothing to be broken, and for one another to be kept."""
        kept: set[int] = set()
        todo = self._core(self.system.broken, left)
        while todo:
            kept |= todo
            more: set[int] = set()
            for i in todo:
                more |= self._core(e.bvnot(self.then[i]), left)
            todo = more - kept
        return sorted(kept)

    def _core(self, goal: Expr, left: Sequence[int]) -> set[int]:
        """Lines that suffice for the goal to be impossible."""
        import z3

        solver = fresh_solver()
        solver.set("timeout", SOON)
        terms = e.z3_terms(
            [e.conj([self.system.within, self.system.allowed, goal]), *(self.now[i] for i in left)],
            context=solver.ctx,
        )
        solver.add(terms[0] == 1)
        marks = {f"!holds {i}": i for i in left}
        assumed = [z3.Bool(mark, solver.ctx) for mark in marks]
        for mark, term in zip(assumed, terms[1:], strict=True):
            solver.add(z3.Implies(mark, term == 1))
        if solver.check(*assumed) != z3.unsat:
            return set(left)
        return {marks[str(each)] for each in solver.unsat_core()}


class _Asker:
    """One solver for all questions whether a step breaks a line: the lines are told to it once, and each question
    assumes some of them."""

    def __init__(
        self, given: Sequence[Expr], now: Sequence[Expr], then: Sequence[Expr], effort: Effort
    ) -> None:
        import z3

        self.effort = effort
        self.solver = fresh_solver()
        context = self.solver.ctx
        self.variables = e.variables([*given, *now, *then])
        terms = e.z3_terms([e.conj(given), *now, *then], context=context)
        self.solver.add(terms[0] == 1)
        before, after = terms[1 : 1 + len(now)], terms[1 + len(now) :]
        self.holds = [z3.Bool(f"!holds {i}", context) for i in range(len(now))]
        self.breaks = [z3.Bool(f"!breaks {i}", context) for i in range(len(then))]
        for mark, term in zip(self.holds, before, strict=True):
            self.solver.add(z3.Implies(mark, term == 1))
        for mark, term in zip(self.breaks, after, strict=True):
            self.solver.add(z3.Implies(mark, term == 0))

    def broken(self, number: int, left: Sequence[int]) -> dict[str, int] | None:
        """A step from where some lines hold to where one does not, or None. Raises OutOfEffort."""
        import z3

        self.effort.check()
        self.solver.set("timeout", max(1, int(self.effort.left * 1000)))
        answer = self.solver.check(self.breaks[number], *(self.holds[i] for i in left))
        if answer == z3.unsat:
            return None
        if answer != z3.sat:
            raise OutOfEffort(f"the solver gave up while {self.effort.doing}")
        model = self.solver.model()
        out = {}
        for v in self.variables:
            value: Any = model.eval(z3.BitVec(v.name, v.width, self.solver.ctx), model_completion=True)
            out[v.name] = value.as_long()
        return out
