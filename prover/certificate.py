"""Certificates: what an engine claims, written as obligations, and their check.

Nothing here searches, and nothing here is used by a search. An orbit is checked step by step: those
outside any repeat are computed, and for those inside one a quantifier-free formula over the repeats' indices
says that no step of any round leads elsewhere or shows another level. A graph's phases and
ranks are checked as one-step claims on every state: phase plus one along each step from a good state, a lower
rank along each step from any other (a simulation relation onto the ideal divider, and a ranking function).
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Mapping, Sequence, Set
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING

from prover import expr as e
from prover import path
from prover.effort import Effort, OutOfEffort
from prover.expr import Expr
from prover.path import Beat, Item, Run, Step
from prover.rhythm import LONGEST_ROUND, Goal, Orbit
from prover.system import State, System, settled_when

if TYPE_CHECKING:
    import numpy as np

    from prover.linear import Logs

COMPUTED_SINGLY = 64
"""Single steps up to which each is evaluated by itself; more are evaluated together on arrays."""

TRIED = 10
"""Bits of variables up to which every assignment is tried."""

STATED_TOGETHER = 64
"""Single steps that are stated in one obligation."""


@dataclass(frozen=True, slots=True)
class Obligation:
    """A formula of one bit that no assignment may make true."""

    name: str
    goal: Expr

    def script(self) -> str:
        """The obligation as an SMT-LIB 2.6 QF_BV script, expected `unsat`."""
        return e.smtlib(self.goal, f"{self.name}: expected unsat")


def discharge(obligation: Obligation, effort: Effort) -> bool:
    """Whether no assignment makes the goal true: by trying all of them on arrays while they are few, else by the
    solver, given nothing but the script's text."""
    if obligation.goal.is_const:
        return obligation.goal.value == 0
    effort.check()
    used = e.variables([obligation.goal])
    if sum(v.width for v in used) <= TRIED:
        return not _all_assignments([obligation.goal], used)[0].any()
    import z3

    solver = z3.SolverFor("QF_BV", ctx=z3.Context())
    solver.set("timeout", max(1, int(effort.left * 1000)))
    solver.from_string(obligation.script())
    answer = solver.check()
    if answer == z3.unknown:
        raise OutOfEffort(f"the solver gave up on the obligation {obligation.name}")
    return bool(answer == z3.unsat)


def _all_assignments(roots: Sequence[Expr], used: Sequence[Expr]) -> list[np.ndarray]:
    """The roots' values for every assignment to the variables, the first of them changing fastest."""
    import numpy as np

    numbers = np.arange(1 << sum(v.width for v in used), dtype=np.uint64)
    values, at = {}, 0
    for v in used:
        values[v.name] = (numbers >> np.uint64(at)) & np.uint64((1 << v.width) - 1)
        at += v.width
    return e.arrays(roots, values)


# -- orbits ------------------------------------------------------------------------------------------------


def orbit_faults(system: System, orbit: Orbit, effort: Effort, refuted: set[Expr] | None = None) -> list[str]:
    """What is wrong with the claim that the machine runs through the orbit; empty if nothing is.

    `refuted` holds goals that were discharged before, such as those of a loop that two orbits share; what is
    discharged here is added."""
    refuted = set() if refuted is None else refuted
    effort.say("checking an orbit's certificate")
    singles = [step for step in orbit_steps(orbit) if not step.axes]
    faults = _wrong_steps(system, singles)
    for obligation in orbit_obligations(system, orbit):
        if obligation.goal in refuted:
            continue
        if discharge(obligation, effort):
            refuted.add(obligation.goal)
        else:
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
    yield from repeat_obligations(system, orbit_steps(orbit))


def repeat_obligations(system: System, steps: Iterable[Step]) -> Iterator[Obligation]:
    """The same for any steps; those outside every repeat are passed over."""
    groups: dict[tuple[tuple[int, State], ...], list[Step]] = {}
    for step in steps:
        if step.axes:
            groups.setdefault(step.axes, []).append(step)
    for number, (axes, members) in enumerate(groups.items()):
        yield Obligation(f"repeat {number}", _steps_goal(system, axes, members))


def single_obligations(system: System, singles: Sequence[Step], name: str) -> Iterator[Obligation]:
    """Obligations, a group of steps each, that no step outside any repeat is other than claimed."""
    state = [e.var(variable, width) for variable, width in system.variables]
    for begin in range(0, len(singles), STATED_TOGETHER):
        wrong = e.FALSE
        for step in singles[begin : begin + STATED_TOGETHER]:
            here = e.conj(e.eq(v, e.const(x, v.width)) for v, x in zip(state, step.source, strict=True))
            there = e.conj(
                e.eq(after, e.const(x, after.width))
                for after, x in zip(system.step, step.target, strict=True)
            )
            fits = e.bvand(there, system.output if step.level else e.bvnot(system.output))
            wrong = e.bvor(wrong, e.bvand(here, e.bvnot(fits)))
        yield Obligation(f"{name}, from step {begin}", wrong)


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


def spread_obligation(system: System, run: Orbit, spread: tuple[int, State], number: int) -> Obligation:
    """No run beside an orbit's lead-in does anything else than the lead-in, moved, and then enters the loop."""
    count, stride = spread
    size = count.bit_length() + 1
    index = e.var("!beside", size)
    within = e.bvult(index, e.const(count, size))
    wrong = e.disj(differs(system, a, b) for a, b in lead_steps(system, run, index, stride))
    return Obligation(f"beside orbit {number}", e.bvand(within, wrong))


def lead_steps(
    system: System, run: Orbit, index: Expr, stride: State
) -> Iterator[tuple[tuple[list[Expr], Expr], tuple[list[Expr], int]]]:
    """The steps of a lead-in moved `index` times by a stride: a state and the condition under which it counts, then
    the claimed successor and level. The last step leads to the loop's entry, unmoved."""
    lead = list(path.steps(run.lead, run.widths, None))
    last = path.last_beat(run.lead, run.widths)
    entry = path.first_state(run.loop)
    for step in [*lead, Step(last.state, entry, last.level, ())]:
        within = e.TRUE
        moves = [(index, stride)]
        for i, (times, along) in enumerate(step.axes):
            size = times.bit_length() + 1
            inner = e.var(f"!along{i}.{size}", size)
            within = e.bvand(within, e.bvult(inner, e.const(times, size)))
            moves.append((inner, along))
        enters = step.target == entry and step.source == last.state and not step.axes
        source = _moved(system, step.source, moves)
        target = _moved(system, step.target, [] if enters else moves)
        yield (source, within), (target, step.level)


def _moved(system: System, base: State, moves: Sequence[tuple[Expr, State]]) -> list[Expr]:
    out: list[Expr] = []
    for place, (_, width) in enumerate(system.variables):
        total = e.const(base[place], width)
        for index, stride in moves:
            if stride[place]:
                scaled = e.bvmul(e.resize(index, width, False), e.const(stride[place], width))
                total = e.bvadd(scaled, total)
        out.append(total)
    return out


def differs(system: System, source: tuple[list[Expr], Expr], target: tuple[list[Expr], int]) -> Expr:
    """True where the source's step counts and is another than to the target at that level."""
    state, within = source
    wanted, level = target
    *step, out = e.substitute([*system.step, system.output], dict(zip(system.names, state, strict=True)))
    wrong = e.disj(e.bvnot(e.eq(a, b)) for a, b in zip(step, wanted, strict=True))
    return e.bvand(within, e.bvor(wrong, e.bvxor(out, e.const(level, 1))))


# -- graphs ------------------------------------------------------------------------------------------------


def rank_faults(system: System, phase: np.ndarray, rank: np.ndarray, goal: Goal, effort: Effort) -> list[str]:
    """What is wrong with the claim that every settled state recovers within its rank.

    `phase` and `rank` have a value for every state number, as `graph` counts them: first register lowest, clock
    highest. Phase −1 says not good. Every state that a settled state can step to is settled or claimed too, so
    the claim is checked for all states that have a rank, and settled states must have one.
    """
    import numpy as np

    effort.say("checking phases and ranks")
    count = 1 << system.bits
    ends = np.cumsum([length for _, length in goal.pulses])
    level = 1 - np.searchsorted(ends, phase, side="right") % 2
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
        if (good & (out.astype(np.int64) != level)).any():
            faults.append("a good state whose output does not fit its phase")
        if (good & (phase[after] != (phase + 1) % goal.period)).any():
            faults.append("a good state whose successor has another phase than the next")
        if (claimed & ~good & ((rank[after] >= rank) | (rank[after] < 0))).any():
            faults.append("a state whose successor has no lower rank")
    return faults


def loop_faults(
    system: System, loops: Sequence[Sequence[int]], distance: np.ndarray, effort: Effort
) -> list[str]:
    """What is wrong with the claim that these are all the loops, in a system without choices.

    `loops` lists the numbers of the states on each, in order; `distance` has for every state the half-cycles
    until it is on one. Every step from a state off the loops has to bring one nearer, and on one lead along it.
    """
    import numpy as np

    effort.say("checking the list of loops")
    numbers = np.arange(1 << system.bits, dtype=np.uint64)
    values, shifts = {}, []
    at = 0
    for name, width in system.variables:
        values[name] = (numbers >> np.uint64(at)) & np.uint64((1 << width) - 1)
        shifts.append(at)
        at += width
    *step, settled = e.arrays([*system.step, system.settled], values)
    after = sum(part.astype(np.int64) << shift for part, shift in zip(step, shifts, strict=True))
    faults: list[str] = []
    following = np.full(len(numbers), -1, dtype=np.int64)
    for states in loops:
        following[list(states)] = [*states[1:], states[0]]
    on_loop = following >= 0
    if (on_loop & (following != after)).any():
        faults.append("a loop that does not lead along itself")
    reached = settled == 1
    if (reached[after][reached] == 0).any():
        faults.append("a settled state that steps to one that is not")
    if (reached & ~on_loop & ((distance <= 0) | (distance[after] >= distance))).any():
        faults.append("a state that gets no nearer to a loop")
    return faults


def _every_choice(system: System) -> Iterator[Mapping[str, int]]:
    bits = sum(width for _, width in system.choices)
    for number in range(1 << bits):
        out: dict[str, int] = {}
        for name, width in system.choices:
            out[name] = number & ((1 << width) - 1)
            number >>= width
        yield out


# -- covers ------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class CoverClaim:
    """Every state under the assumption is good within `bound` half-cycles.

    orbits   runs whose loops are good; `recoveries` says after how many half-cycles each of them is
    unrolled 0: every state is on one of the orbits within `merge` half-cycles, at a place no nearer to the
             orbit's start than the half-cycles that took (or where it is good). Otherwise: after so many
             half-cycles every state is at a good place of some orbit, or comes to one within `merge` half-cycles
             with the output on the way as the phase of that place wants it. Of more than FEW half-cycles only the
             last is looked at.
    spreads  for each orbit a count and a vector if its lead-in stands for that many, side by side, each moved by
             the vector from the one before, and all entering the loop at the same place; else None
    period, high  what good means, in half-cycles; period 0: on a loop, whatever its wave
    """

    orbits: tuple[Orbit, ...]
    recoveries: tuple[int, ...]
    spreads: tuple[tuple[int, State] | None, ...]
    unrolled: int | None
    merge: int
    bound: int
    period: int
    high: int


@dataclass(frozen=True, slots=True)
class Stage:
    """A set of registers that depends on no other, and the claim that it is covered.

    The claim of a stage is made for states in which the stage before it is on its loops."""

    system: System
    claim: CoverClaim


def part(system: System, names: Set[str]) -> System:
    """The machine of some registers (and the clock) that depend on no other; its output is of no interest."""
    moment = system.moment()
    settled = [settled_when([r], moment) for r in system.design.registers if r.name in names]
    inner = [x for x in settled if {v.name for v in e.variables([x])} <= names]
    return replace(
        system,
        variables=tuple(pair for pair in system.variables if pair[0] in names),
        step=tuple(x for name, x in zip(system.names, system.step, strict=True) if name in names),
        output=e.FALSE,
        settled=e.conj(inner),
    )


def assumption(system: System, before: Stage | None) -> Expr:
    """One bit: a power-up state in which the stage before is on one of its loops."""
    if before is None:
        return system.settled
    state = [e.var(name, width) for name, width in before.system.variables]
    loops = {frozenset(run.loop): run.loop for run in before.claim.orbits}
    places = {(beat, axes) for loop in loops.values() for beat, axes, _, _ in _written(loop, 0, 0, ())}
    on_loop = e.disj(_is_at(before.system, state, beat, axes) for beat, axes in sorted(places))
    return e.bvand(system.settled, on_loop)


def stage_faults(system: System, stages: Sequence[Stage], bound: int, effort: Effort) -> list[str]:
    """What is wrong with the claim that every power-up state is good within the bound, stage after stage."""
    faults = stage_form_faults(system, stages, bound)
    if faults:
        return faults
    effort.say("checking a cover")
    for stage, ours, assumed in claimed_stages(system, stages):
        refuted: set[Expr] = set()
        for run in stage.claim.orbits:
            faults += orbit_faults(ours, run, effort, refuted)
        if not faults:
            obligations = cover_obligations(ours, assumed, stage.claim)
            faults += [each.name for each in obligations if not discharge(each, effort)]
    return faults


def stage_form_faults(system: System, stages: Sequence[Stage], bound: int) -> list[str]:
    """What can be seen to be wrong with the same claim without a solver: its form, and the waves of its orbits."""
    if not stages or stages[-1].system.variables != system.variables:
        return ["the last stage is not the whole machine"]
    faults: list[str] = []
    before: Stage | None = None
    for stage, ours, _ in claimed_stages(system, stages):
        names = set(stage.system.names)
        outside = {v.name for v in e.variables(ours.step) if not v.name.startswith("?")} - names
        if outside or (before is not None and not set(before.system.names) <= names):
            faults.append("a stage that depends on registers outside it")
        if stage is not stages[-1] and stage.claim.period:
            faults.append("a stage before the last that claims a wave")
        for run, recovery in zip(stage.claim.orbits, stage.claim.recoveries, strict=True):
            if not run.closed or recovery > stage.claim.bound or not good_from(run, recovery, stage.claim):
                faults.append(f"an orbit that is not good after {recovery} half-cycles")
        before = stage
    if sum(stage.claim.bound for stage in stages) > bound:
        faults.append("stages that take longer than the bound together")
    return faults


def claimed_stages(system: System, stages: Sequence[Stage]) -> Iterator[tuple[Stage, System, Expr]]:
    """Each stage, the machine it speaks of as derived here, and what may be assumed of its states."""
    before: Stage | None = None
    for stage in stages:
        ours = system if stage is stages[-1] else part(system, set(stage.system.names))
        yield stage, ours, assumption(ours, before)
        before = stage


def good_from(run: Orbit, recovery: int, claim: CoverClaim | Goal) -> bool:
    """Whether from half-cycle `recovery` on the output is high `high` of every `period` half-cycles, for ever.

    False as well where the output changes too often for that to be looked through."""
    if claim.period == 0:
        return recovery >= run.lead_half_cycles
    changes = path.changes(run.lead, LONGEST_ROUND) + path.changes(run.loop, LONGEST_ROUND)
    if recovery > run.lead_half_cycles or changes > LONGEST_ROUND:
        return False
    rounds = [*path.pieces(run.lead), *path.pieces(run.loop), *path.pieces(run.loop)]
    at = 0
    runs: list[tuple[int, int]] = []
    for level, size in path.merged(rounds):
        begins = max(at, recovery)
        at += size
        if at > begins:
            runs.append((level, at - begins))
    # Twice round shows the seam of the loop; a round that holds no change at all is not periodic.
    goal = claim if isinstance(claim, Goal) else Goal(claim.period, claim.high)
    return len(runs) > 2 and run.loop_half_cycles % goal.period == 0 and _is_stretch(runs, goal.pulses)


def _is_stretch(runs: Sequence[Run], pulses: Sequence[Run]) -> bool:
    """Whether the runs are a stretch of the wave with the period `pulses`: whole but for the first and the last."""
    (first_level, first), *inner, (_, last) = runs
    for begins in range(len(pulses)):
        level, most = pulses[begins - 1]
        if level != first_level or first > most:
            continue
        whole = all(run == pulses[(begins + i) % len(pulses)] for i, run in enumerate(inner))
        if whole and last <= pulses[(begins + len(inner)) % len(pulses)][1]:
            return True
    return False


def cover_obligations(system: System, assumed: Expr, claim: CoverClaim) -> Iterator[Obligation]:
    """No run beside an orbit is other than it; and, for each level of the clock, no state under the assumption
    escapes the orbits."""
    for number, (run, spread) in enumerate(zip(claim.orbits, claim.spreads, strict=True)):
        if spread:
            yield spread_obligation(system, run, spread, number)
    for level in (0, 1):
        fixed = {system.clock: e.const(level, 1)}
        (premise,) = e.substitute([assumed], fixed)
        state = [fixed.get(name, e.var(name, width)) for name, width in system.variables]
        yield Obligation(f"cover, clock {level}", e.bvand(premise, e.bvnot(_covered(system, state, claim))))


def _covered(system: System, state: list[Expr], claim: CoverClaim) -> Expr:
    levels: list[Expr] = []
    gone = 0

    def onward() -> None:
        nonlocal state, gone
        *state, level = onwards(system, state, gone)
        levels.append(level)
        gone += 1

    reached: list[Expr] = []
    if claim.unrolled is None:
        for count in range(claim.merge + 1):
            if count > claim.bound:
                break
            reached.append(_on_orbits(system, state, claim, count))
            onward()
        return e.disj(reached)
    for _ in range(claim.unrolled):
        onward()
    levels.clear()
    for count in range(claim.merge + 1):
        if count < claim.merge > FEW:
            pass
        elif count == 0:
            reached.append(_on_orbits(system, state, claim, None))
        elif claim.period:
            reached.append(_behind_loops(system, state, levels, claim))
        onward()
    return e.disj(reached)


def onwards(system: System, state: Sequence[Expr], number: int) -> list[Expr]:
    """The state one half-cycle on and then the output of this one. Choices are new in every half-cycle, which the
    number tells apart: what x stands for now says nothing of what it stands for later."""
    values = dict(zip(system.names, state, strict=True))
    values |= {name: e.var(f"{name}/{number}", width) for name, width in system.choices}
    return e.substitute([*system.step, system.output], values)


Axes = tuple[tuple[int, State], ...]

FEW = 4
"""Half-cycles ahead at each of which a state is looked for on a loop."""


def _written(
    items: Sequence[Item], first: int, last: int, axes: Axes
) -> Iterator[tuple[State, Axes, int, int]]:
    """Beats with the repeats around them and the first and last half-cycle at which they come."""
    for item in items:
        if isinstance(item, Beat):
            yield item.state, axes, first, last
        else:
            once = path.length(item.body)
            later = last + (item.times - 1) * once
            yield from _written(item.body, first, later, (*axes, (item.times, item.stride)))
        first += item.length
        last += item.length


def _on_orbits(system: System, state: Sequence[Expr], claim: CoverClaim, count: int | None) -> Expr:
    """True of a state on an orbit where it is good or, given `count`, at least that far from the orbit's start."""
    places: set[tuple[State, Axes]] = set()
    for run, recovery, spread in zip(claim.orbits, claim.recoveries, claim.spreads, strict=True):
        lead = run.lead_half_cycles
        for items, offset, around in ((run.lead, 0, (spread,) if spread else ()), (run.loop, lead, ())):
            for beat, axes, first, _ in _written(items, offset, offset, around):
                if first >= recovery or (count is not None and first >= count):
                    places.add((beat, axes))
    return e.disj(_is_at(system, state, beat, axes) for beat, axes in sorted(places))


def _behind_loops(system: System, state: Sequence[Expr], levels: Sequence[Expr], claim: CoverClaim) -> Expr:
    """True of a state on a loop, where the output before it was what the wave has there."""
    places: set[tuple[State, Axes, tuple[int, ...]]] = set()
    back = len(levels)
    for run in {frozenset(run.loop): run for run in claim.orbits}.values():
        lead = run.lead_half_cycles
        rise = _rise(run)
        for beat, axes, first, last in _written(run.loop, lead, lead, ()):
            begins, ends = (first - back - rise) % claim.period, last - first + back
            in_high = begins < claim.high
            room = (claim.high if in_high else claim.period) - begins
            if axes and ends >= room:
                continue
            wanted = tuple(int((begins + i) % claim.period < claim.high) for i in range(back))
            places.add((beat, axes, wanted))
    parts = []
    for beat, axes, wanted in sorted(places):
        fits = e.conj(e.bvnot(e.bvxor(x, e.const(v, 1))) for x, v in zip(levels, wanted, strict=True))
        parts.append(e.bvand(fits, _is_at(system, state, beat, axes)))
    return e.disj(parts)


def _rise(run: Orbit) -> int:
    """A half-cycle, counted from the orbit's start, in its loop or the next round, at which the output rises."""
    at = run.lead_half_cycles
    before: int | None = None
    for level, size in [*path.pieces(run.loop), *path.pieces(run.loop)]:
        if level == 1 and before == 0:
            return at
        before = level
        at += size
    return at


def _is_at(system: System, state: Sequence[Expr], beat: State, axes: Axes) -> Expr:
    """True of the beat's state in some round of each repeat around it. False where that can't be written: a claim
    may then fail, but nothing false passes."""
    shift = [e.const(value, width) for value, (_, width) in zip(beat, system.variables, strict=True)]
    within = e.TRUE
    first = list(shift)
    strides = [stride for _, stride in axes]
    for i, (count, stride) in enumerate(axes):
        index = round_at(system, state, first, strides, i)
        if index is None:
            return e.FALSE
        if count < 1 << index.width:
            within = e.bvand(within, e.bvult(index, e.const(count, index.width)))
        for r, (_, w) in enumerate(system.variables):
            if stride[r]:
                moved = e.bvmul(e.resize(index, w, False), e.const(stride[r], w))
                shift[r] = e.bvadd(shift[r], moved)
    return e.conj([within, *(e.eq(a, b) for a, b in zip(state, shift, strict=True))])


def round_at(
    system: System, state: Sequence[Expr], first: Sequence[Expr], strides: Sequence[State], number: int
) -> Expr | None:
    """In which round of one of the repeats around a place a state is, if `first` is the place in the first round of
    all: read from a register that no other repeat moves. None where there is no such register."""
    stride = strides[number]
    others = [other for i, other in enumerate(strides) if i != number]
    free = [
        (stride[r] & -stride[r], r)
        for r in range(len(stride))
        if stride[r] and not any(other[r] for other in others)
    ]
    if not free:
        return None
    unit, register = min(free)
    width = system.variables[register][1]
    # stride · index = difference (mod 2^width): divide by the power of two, then by the odd rest.
    twos = unit.bit_length() - 1
    exact = e.extract(e.bvsub(state[register], first[register]), width - 1, twos)
    inverse = pow(stride[register] >> twos, -1, 1 << (width - twos))
    return e.bvmul(exact, e.const(inverse, width - twos))


def reset_goal(system: System, level: int, count: int, wanted: Sequence[State]) -> Obligation:
    """From any state at rest with the clock at that level, `count` half-cycles of `system` (reset held) end in one of
    the wanted states."""
    state: list[Expr] = [e.var(name, width) for name, width in system.variables[:-1]]
    state.append(e.const(level, 1))
    (at_rest,) = e.substitute([system.settled], dict(zip(system.names, state, strict=True)))
    for gone in range(count):
        state = onwards(system, state, gone)[:-1]
    hits = [
        e.conj(e.eq(a, e.const(v, a.width)) for a, v in zip(state, target, strict=True)) for target in wanted
    ]
    name = f"the states that {count} half-cycles of reset leave, begun with the clock {'high' if level else 'low'}"
    return Obligation(name, e.conj([at_rest, *(e.bvnot(hit) for hit in hits)]))


# -- Gray codes --------------------------------------------------------------------------------------------


def gray_obligations(system: System, numbered: System, known: Mapping[Expr, Expr]) -> Iterator[Obligation]:
    """What has to hold of a system in which registers in Gray code are read as numbers: `known` expressions are the
    numbers they are taken for, and each step, put back into Gray code, is the system's own."""
    before, after = dict(system.variables), dict(numbered.variables)
    back = {register: _in_gray(e.var(number, after[number])) for number, register in numbered.grays}
    for at, (x, number) in enumerate(known.items()):
        (value,) = e.substitute([x], back)
        yield Obligation(f"the number that a Gray code stands for, {at}", e.bvnot(e.eq(value, number)))
    codes = {register for _, register in numbered.grays}
    ours = [*system.step, system.output, system.settled]
    theirs = [*numbered.step, numbered.output, numbered.settled]
    names = [
        *(f"the step of {name}, in binary" for name in before),
        "the output, in binary",
        "at rest, in binary",
    ]
    stepped = [_in_gray(x) if name in codes else x for name, x in zip([*before, "", ""], theirs, strict=True)]
    for name, mine, other in zip(names, e.substitute(_put_in(ours, known), back), stepped, strict=True):
        if mine is not other:
            yield Obligation(name, e.bvnot(e.eq(mine, other)))


def _in_gray(number: Expr) -> Expr:
    return e.bvxor(number, e.binary("bvlshr", number, e.const(1, number.width)))


def _put_in(roots: Sequence[Expr], by_node: Mapping[Expr, Expr]) -> list[Expr]:
    """The roots with whole nodes replaced."""
    memo: dict[Expr, Expr] = {}
    for node in e.topological(roots):
        memo[node] = by_node[node] if node in by_node else e.rebuild(node, [memo[a] for a in node.args])
    return [memo[root] for root in roots]


# -- linear registers --------------------------------------------------------------------------------------


def linear_faults(system: System, logs: Logs, effort: Effort) -> list[str]:
    """What is wrong with reading a system's registers as the powers of a matrix; empty if nothing is."""
    effort.say("checking a linear register")
    faults = linear_form_faults(system, logs)
    for number, name in enumerate(
        ("a step that is not the matrix", "an output that tells no state from the others")
    ):
        pairs = (
            [list(linear_obligations(system, logs, way, way))[number] for way in (0, 1)] if not faults else []
        )
        if not any(all(discharge(each, effort) for each in pair) for pair in pairs):
            faults.append(name)
    return faults


def linear_form_faults(system: System, logs: Logs) -> list[str]:
    """What can be seen to be wrong with that without a solver."""
    registers = system.variables[:-1]
    n = sum(width for _, width in registers)
    if logs.registers != tuple(registers) or len(logs.columns) != n:
        return ["a matrix of another size than the registers"]
    if any(word >> n for word in (*logs.columns, logs.fixed, logs.start)):
        return ["a word of another size than the registers"]
    faults: list[str] = []
    if not _full_order(_rows(logs)):
        faults.append("a matrix of another order than 2^n - 1")
    if logs.start == logs.fixed:
        faults.append("a decoded state that is the fixed one")
    if system.settled is not e.TRUE or system.choices:
        faults.append("registers that are held or hang on x")
    return faults


def linear_obligations(
    system: System, logs: Logs, moving: int, level: int
) -> Iterator[tuple[Obligation, ...]]:
    """What has to hold of it: the edge from a clock at `moving` goes by x -> M·x + c and the other one moves nothing;
    the output is `level` in the state that is decoded and nowhere else.

    Stated with rows where the search has columns. That c is M·a + a makes a the fixed state."""
    bits = [e.extract(e.var(name, width), i, i) for name, width in logs.registers for i in range(width)]
    rows = _rows(logs)
    offset = [(_dot(row, logs.fixed) ^ logs.fixed >> r) & 1 for r, row in enumerate(rows)]

    def stepped(clock: int) -> list[Expr]:
        after = e.substitute(list(system.step[:-1]), {system.clock: e.const(clock, 1)})
        return [e.extract(x, i, i) for x in after for i in range(x.width)]

    held = e.disj(e.bvxor(a, b) for a, b in zip(stepped(1 - moving), bits, strict=True))
    wanted = (_row(row, c, bits) for row, c in zip(rows, offset, strict=True))
    moved = e.disj(e.bvxor(a, b) for a, b in zip(stepped(moving), wanted, strict=True))
    yield Obligation("one edge moves no register", held), Obligation("the other goes by the matrix", moved)
    at_start = e.conj(b if logs.start >> i & 1 else e.bvnot(b) for i, b in enumerate(bits))
    shown = e.bvxor(system.output, at_start)
    yield (Obligation("the output tells the decoded state", shown if level else e.bvnot(shown)),)


def _rows(logs: Logs) -> list[int]:
    n = len(logs.columns)
    return [sum((column >> r & 1) << c for c, column in enumerate(logs.columns)) for r in range(n)]


def _dot(row: int, x: int) -> int:
    return (row & x).bit_count() & 1


def _row(row: int, constant: int, bits: Sequence[Expr]) -> Expr:
    total = e.const(constant, 1)
    for i, bit in enumerate(bits):
        if row >> i & 1:
            total = e.bvxor(total, bit)
    return total


def _full_order(rows: Sequence[int]) -> bool:
    n = len(rows)
    one = [1 << i for i in range(n)]

    def times(a: Sequence[int], b: Sequence[int]) -> list[int]:
        out = []
        for row in a:
            total = 0
            for i in range(n):
                if row >> i & 1:
                    total ^= b[i]
            out.append(total)
        return out

    def to_the(exponent: int) -> list[int]:
        out = one
        for digit in bin(exponent)[2:]:
            out = times(out, out)
            if digit == "1":
                out = times(out, rows)
        return out

    whole = rest = (1 << n) - 1
    if to_the(whole) != one:
        return False
    p = 3
    while rest > 1:
        # Past the root of what is left, that is a prime itself.
        p = p if p * p <= rest else rest
        if rest % p == 0:
            if to_the(whole // p) == one:
                return False
            while rest % p == 0:
                rest //= p
        p += 2
    return True
