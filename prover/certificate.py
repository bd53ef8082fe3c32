"""Certificates: what an engine claims, written as obligations, and their check.

Nothing here searches, and nothing here is used by a search. An orbit is checked step by step: those
outside any repeat are computed, and for those inside one a quantifier-free formula over the repeats' indices
says that no step of any round leads elsewhere or shows another level. A graph's phases and
ranks are checked as one-step claims on every state: phase plus one along each step from a good state, a lower
rank along each step from any other (a simulation relation onto the ideal divider, and a ranking function).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from prover import expr as e
from prover import path
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.path import Step
from prover.rhythm import Orbit
from prover.system import State, System

if TYPE_CHECKING:
    import numpy as np

COMPUTED_SINGLY = 64
"""Single steps up to which each is evaluated by itself; more are evaluated together on arrays."""


@dataclass(frozen=True, slots=True)
class Obligation:
    """A formula of one bit that no assignment may make true."""

    name: str
    goal: Expr

    def script(self) -> str:
        """The obligation as an SMT-LIB 2.6 QF_BV script, expected `unsat`."""
        return e.smtlib(self.goal, f"{self.name}: expected unsat")


def discharge(obligation: Obligation, effort: Effort) -> bool:
    """Whether the solver, given nothing but the script's text, refutes it."""
    if obligation.goal.is_const:
        return obligation.goal.value == 0
    import z3

    effort.check()
    solver = z3.SolverFor("QF_BV")
    solver.set("timeout", max(1, int(effort.left * 1000)))
    solver.from_string(obligation.script())
    answer = solver.check()
    if answer == z3.unknown:
        raise OutOfEffort(f"the solver gave up on the obligation {obligation.name}")
    return bool(answer == z3.unsat)


# -- orbits ------------------------------------------------------------------------------------------------


def orbit_faults(system: System, orbit: Orbit, effort: Effort) -> list[str]:
    """What is wrong with the claim that the machine runs through the orbit; empty if nothing is."""
    effort.say("checking an orbit's certificate")
    singles = [step for step in orbit_steps(orbit) if not step.axes]
    faults = _wrong_steps(system, singles)
    for obligation in orbit_obligations(system, orbit):
        if not discharge(obligation, effort):
            faults.append(obligation.name)
    return faults


def orbit_steps(orbit: Orbit) -> Iterator[Step]:
    """Every step that the orbit claims: along the lead-in, into the loop, and round it."""
    if orbit.loop:
        entry = path.first_state(orbit.loop)
        yield from path.steps(orbit.lead, orbit.widths, entry)
        yield from path.steps(orbit.loop, orbit.widths, entry)
    else:
        yield from path.steps(orbit.lead, orbit.widths, None)


def _wrong_steps(system: System, singles: Sequence[Step]) -> list[str]:
    if len(singles) > COMPUTED_SINGLY and not system.choices:
        return _wrong_steps_together(system, singles)
    return [f"the step from {system.describe(s.source)}" for s in singles if not _computes(system, s)]


def _computes(system: System, step: Step) -> bool:
    """Whether a single step, computed for every value of the choices, is as claimed."""
    if system.choices:
        fixed = {n: e.const(v, w) for (n, w), v in zip(system.variables, step.source, strict=True)}
        *after, out = e.substitute([*system.step, system.output], fixed)
        wanted = [e.const(v, w) for (_, w), v in zip(system.variables, step.target, strict=True)]
        wrong = e.disj(e.bvnot(e.eq(a, b)) for a, b in zip(after, wanted, strict=True))
        wrong = e.bvor(wrong, e.bvxor(out, e.const(step.level, 1)))
        return discharge(Obligation("a single step", wrong), Effort(10))
    values = dict(zip(system.names, step.source, strict=True))
    *computed, level = e.evaluate([*system.step, system.output], values)
    return tuple(computed) == step.target and level == step.level


def _wrong_steps_together(system: System, singles: Sequence[Step]) -> list[str]:
    import numpy as np

    kind = np.uint64 if all(w <= 64 for _, w in system.variables) else object

    def columns(states: Sequence[State]) -> list[np.ndarray]:
        return [np.array(column, dtype=kind) for column in zip(*states, strict=True)]

    values = dict(zip(system.names, columns([s.source for s in singles]), strict=True))
    *after, out = e.arrays([*system.step, system.output], values)
    wrong = out != np.array([s.level for s in singles], dtype=out.dtype)
    for computed, claimed in zip(after, columns([s.target for s in singles]), strict=True):
        wrong |= computed != claimed
    return [f"the step from {system.describe(singles[int(i)].source)}" for i in np.flatnonzero(wrong)]


def orbit_obligations(system: System, orbit: Orbit) -> Iterator[Obligation]:
    """One obligation for all the steps that share their repeats: none of them is other than claimed."""
    groups: dict[tuple[tuple[int, State], ...], list[Step]] = {}
    for step in orbit_steps(orbit):
        if step.axes:
            groups.setdefault(step.axes, []).append(step)
    for number, (axes, members) in enumerate(groups.items()):
        yield Obligation(f"repeat {number}", _steps_goal(system, axes, members))


def _steps_goal(system: System, axes: Sequence[tuple[int, State]], members: Sequence[Step]) -> Expr:
    """True of indices within the axes at which some of the steps is another than claimed."""
    within = e.TRUE
    shift = [e.const(0, width) for _, width in system.variables]
    for i, (count, stride) in enumerate(axes):
        size = count.bit_length() + 1
        index = e.var(f"!index{i}", size)
        within = e.bvand(within, e.bvult(index, e.const(count, size)))
        for j, (_, width) in enumerate(system.variables):
            if stride[j]:
                scaled = e.bvmul(e.resize(index, width, False), e.const(stride[j], width))
                shift[j] = e.bvadd(shift[j], scaled)
    broken = e.FALSE
    for step in members:
        here = {
            name: e.bvadd(by, e.const(value, width))
            for (name, width), by, value in zip(system.variables, shift, step.source, strict=True)
        }
        *computed, out = e.substitute([*system.step, system.output], here)
        for value, by, wanted in zip(computed, shift, step.target, strict=True):
            broken = e.bvor(broken, e.bvnot(e.eq(value, e.bvadd(by, e.const(wanted, by.width)))))
        broken = e.bvor(broken, e.bvxor(out, e.const(step.level, 1)))
    return e.bvand(within, broken)


# -- graphs ------------------------------------------------------------------------------------------------


def rank_faults(
    system: System, phase: np.ndarray, rank: np.ndarray, period: int, high: int, effort: Effort
) -> list[str]:
    """What is wrong with the claim that every settled state recovers within its rank.

    `phase` and `rank` have a value for every state number, as `graph` counts them: first register lowest, clock
    highest. Phase −1 says not good. Every state that a settled state can step to is settled or claimed too, so
    the claim is checked for all states that have a rank, and settled states must have one.
    """
    import numpy as np

    effort.say("checking phases and ranks")
    count = 1 << system.bits
    numbers = np.arange(count, dtype=np.uint64)
    shifts = np.cumsum([0, *(w for _, w in system.variables)])
    values = {
        name: (numbers >> np.uint64(shift)) % np.uint64(1 << width)
        for (name, width), shift in zip(system.variables, shifts[:-1], strict=True)
    }
    (settled,) = e.arrays([system.settled], values)
    faults: list[str] = []
    if ((settled == 1) & (rank < 0)).any():
        faults.append("a power-up state without a rank")
    claimed = rank >= 0
    good = phase >= 0
    if (good != (rank == 0)).any():
        faults.append("a rank of zero where there is no phase, or the other way round")
    for choice in _every_choice(system):
        for name, value in choice.items():
            values[name] = np.full(count, value, dtype=np.uint64)
        *step, out = e.arrays([*system.step, system.output], values)
        after = np.zeros(count, dtype=np.int64)
        for part, shift in zip(step, shifts[:-1], strict=True):
            after += part.astype(np.int64) << int(shift)
        if (good & (out.astype(np.int64) != (phase < high))).any():
            faults.append("a good state whose output does not fit its phase")
        if (good & (phase[after] != (phase + 1) % period)).any():
            faults.append("a good state whose successor has another phase than the next")
        if (claimed & ~good & ((rank[after] >= rank) | (rank[after] < 0))).any():
            faults.append("a state whose successor has no lower rank")
    return faults


def _every_choice(system: System) -> Iterator[Mapping[str, int]]:
    bits = sum(width for _, width in system.choices)
    for number in range(1 << bits):
        out: dict[str, int] = {}
        for name, width in system.choices:
            out[name] = number & ((1 << width) - 1)
            number >>= width
        yield out


def reset_goal(system: System, count: int, wanted: Sequence[State]) -> Obligation:
    """From any state, `count` half-cycles of `system` (reset held) end in one of the wanted states."""
    state: list[Expr] = [e.var(name, width) for name, width in system.variables]
    for _ in range(count):
        state = e.substitute(list(system.step), dict(zip(system.names, state, strict=True)))
    hits = [
        e.conj(e.eq(a, e.const(v, a.width)) for a, v in zip(state, target, strict=True)) for target in wanted
    ]
    return Obligation("the states that reset leaves", e.conj(e.bvnot(hit) for hit in hits))
