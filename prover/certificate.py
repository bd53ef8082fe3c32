"""Certificates: what an engine claims, written as obligations, and their check.

Nothing here searches, and nothing here is used by a search. An orbit is checked stretch by stretch: one
quantifier-free formula for each stretch of more than one cycle says that no cycle of it breaks the stride or
the output's levels, single cycles are computed, and stretches must join end to start. A graph's phases and
ranks are checked as one-step claims on every state: phase plus one along each step from a good state, a lower
rank along each step from any other (a simulation relation onto the ideal divider, and a ranking function).
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING

from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.rhythm import Orbit, Stretch
from prover.system import State, System

if TYPE_CHECKING:
    import numpy as np

COMPUTED_SINGLY = 512
"""Single cycles up to which each is evaluated by itself; more are evaluated together on arrays."""


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
    faults = [f"stretch {i} does not join the next" for i in _loose_ends(orbit)]
    singles = [s for s in orbit.stretches if s.cycles == 1]
    faults += _wrong_cycles(system, singles)
    for obligation in orbit_obligations(system, orbit):
        if not discharge(obligation, effort):
            faults.append(obligation.name)
    return faults


def _loose_ends(orbit: Orbit) -> Iterator[int]:
    """Indices of stretches that do not end where the next one (or the loop) begins."""
    for i, stretch in enumerate(orbit.stretches):
        if i + 1 < len(orbit.stretches):
            following = orbit.stretches[i + 1].start
        elif orbit.loop_from is not None:
            following = orbit.stretches[orbit.loop_from].start
        else:
            return
        end = tuple(
            (value + stretch.cycles * step) & ((1 << width) - 1)
            for value, step, width in zip(stretch.start, stretch.stride, orbit.widths, strict=True)
        )
        if end != following or stretch.cycles < 1:
            yield i


def _wrong_cycles(system: System, singles: Sequence[Stretch]) -> list[str]:
    if not singles:
        return []
    if len(singles) > COMPUTED_SINGLY:
        return _wrong_cycles_together(system, singles)
    faults = []
    for stretch in singles:
        if not _computes(system, stretch):
            faults.append(f"the cycle from {system.describe(stretch.start)}")
    return faults


def _computes(system: System, stretch: Stretch) -> bool:
    """Whether one cycle, computed for every value of the choices at zero, is as the stretch says."""
    end = tuple(
        (value + step) & ((1 << width) - 1)
        for value, step, (_, width) in zip(stretch.start, stretch.stride, system.variables, strict=True)
    )
    pairs = ((stretch.start, stretch.middle, stretch.levels[0]), (stretch.middle, end, stretch.levels[1]))
    for state, following, level in pairs:
        values = dict(zip(system.names, state, strict=True))
        if system.choices:
            fixed = {n: e.const(v, w) for (n, w), v in zip(system.variables, state, strict=True)}
            *step, out = e.substitute([*system.step, system.output], fixed)
            wanted = [e.const(v, w) for (_, w), v in zip(system.variables, following, strict=True)]
            wrong = e.disj(e.bvnot(e.eq(a, b)) for a, b in zip(step, wanted, strict=True))
            wrong = e.bvor(wrong, e.bvxor(out, e.const(level, 1)))
            if not discharge(Obligation("a single step", wrong), Effort(10)):
                return False
            continue
        *step_values, level_value = e.evaluate([*system.step, system.output], values)
        if tuple(step_values) != following or level_value != level:
            return False
    return True


def _wrong_cycles_together(system: System, singles: Sequence[Stretch]) -> list[str]:
    import numpy as np

    if system.choices:
        return [f"the cycle from {s.start}" for s in singles if not _computes(system, s)]

    def columns(states: Sequence[State]) -> list[np.ndarray]:
        kind = np.uint64 if all(w <= 64 for _, w in system.variables) else object
        return [np.array(column, dtype=kind) for column in zip(*states, strict=True)]

    starts, middles = columns([s.start for s in singles]), columns([s.middle for s in singles])
    widths = [w for _, w in system.variables]
    ends = columns([
        tuple((v + d) & ((1 << w) - 1) for v, d, w in zip(s.start, s.stride, widths, strict=True))
        for s in singles
    ])  # fmt: skip
    wrong = np.zeros(len(singles), dtype=bool)
    for half, (here, there) in enumerate(((starts, middles), (middles, ends))):
        values = dict(zip(system.names, here, strict=True))
        *step, out = e.arrays([*system.step, system.output], values)
        for computed, claimed in zip(step, there, strict=True):
            wrong |= computed != claimed
        wrong |= out != np.array([s.levels[half] for s in singles], dtype=out.dtype)
    return [f"the cycle from {system.describe(singles[int(i)].start)}" for i in np.flatnonzero(wrong)]


def orbit_obligations(system: System, orbit: Orbit) -> Iterator[Obligation]:
    """One obligation for each stretch of several cycles: no cycle of it is other than claimed."""
    for i, stretch in enumerate(orbit.stretches):
        if stretch.cycles > 1:
            yield Obligation(f"stretch {i}", _stretch_goal(system, stretch))


def _stretch_goal(system: System, stretch: Stretch) -> Expr:
    """True of a cycle number in which the stretch is broken."""
    # One bit more than the count needs, so that count + 1 does not wrap.
    size = stretch.cycles.bit_length() + 1
    index = e.var("!cycle", size)
    within = e.bvult(index, e.const(stretch.cycles, size))
    following = e.bvadd(index, e.const(1, size))

    def place(base: State, at: Expr) -> dict[str, Expr]:
        out = {}
        for (name, width), value, step in zip(system.variables, base, stretch.stride, strict=True):
            if step == 0:
                out[name] = e.const(value, width)
            else:
                times = e.bvmul(e.resize(at, width, False), e.const(step, width))
                out[name] = e.bvadd(times, e.const(value, width))
        return out

    first, second, third = (
        place(stretch.start, index),
        place(stretch.middle, index),
        place(stretch.start, following),
    )
    broken = e.FALSE
    for here, there, level in ((first, second, stretch.levels[0]), (second, third, stretch.levels[1])):
        computed = e.substitute([*system.step, system.output], here)
        for value, name in zip(computed, system.names, strict=False):
            broken = e.bvor(broken, e.bvnot(e.eq(value, there[name])))
        broken = e.bvor(broken, e.bvxor(computed[-1], e.const(level, 1)))
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
