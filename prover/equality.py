"""When two outputs are equal: what has to hold of two orbits, and of two dividers that run side by side.

Two closed dividers are equal if their orbits' outputs are, which is decided exactly on the orbits as they are
written, without unrolling a repeat: where a stretch of one with period p meets a stretch of the other with period q
and they agree for p + q half-cycles, they agree for as long as both stretches last (Fine and Wilf 1965). Of dividers
side by side an invariant is shown that holds at the start, goes on holding, and in which the outputs agree: a
simulation relation. What is found by search is checked here from what it claims; no engine is imported.
"""

from __future__ import annotations

from bisect import bisect_right
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass
from itertools import islice, product
from math import gcd, inf
from typing import TYPE_CHECKING

from prover import expr as e
from prover.certificate import Obligation, discharge
from prover.effort import Effort
from prover.errors import InternalError
from prover.expr import Expr
from prover.joint import Held, Joint, Start, renamed
from prover.path import Item, Repeat, Run
from prover.rhythm import Orbit
from prover.solve import Model, constant
from prover.system import State
from prover.trace import Rest, Trace, run

if TYPE_CHECKING:
    import numpy as np


@dataclass(frozen=True, slots=True)
class _Stretch:
    """From a half-cycle on: for how many the output goes on with this period. `level` where it keeps one."""

    length: float
    period: int
    level: int | None


def first_difference(old: Orbit, new: Orbit, lag: int = 0) -> int | None:
    """The first half-cycle t in which the old output is another than the new one in half-cycle t + lag.

    None if there is none, ever, or none as far as both orbits are known (see `known_for`)."""
    ahead, behind = max(-lag, 0), max(lag, 0)
    last = known_for(old, new, lag)
    found = _agree(_Word(old), ahead, _Word(new), behind, last)
    return None if found == last else int(found) + ahead


def known_for(old: Orbit, new: Orbit, lag: int = 0) -> float:
    """For how many half-cycles a comparison of the two means anything: for ever if both are closed."""
    return min(_Word(old).known - max(-lag, 0), _Word(new).known - max(lag, 0))


class _Word:
    """An orbit's output, looked up by half-cycle."""

    def __init__(self, orbit: Orbit) -> None:
        self.orbit = orbit
        self.known = inf if orbit.closed else orbit.lead_half_cycles
        self.indices: dict[int, tuple[list[int], list[tuple[int, Item]]]] = {}

    def stretches(self, at: int) -> list[_Stretch]:
        """The periodic stretches that it is in at a half-cycle, the longest first; the last keeps one level."""
        out: list[_Stretch] = []
        items: Sequence[Item] = self.orbit.lead
        if at >= self.orbit.lead_half_cycles:
            size = self.orbit.loop_half_cycles
            out.append(_Stretch(inf, size, None))
            at, items = (at - self.orbit.lead_half_cycles) % size, self.orbit.loop
        while True:
            begins, found = self._index(items)
            place = bisect_right(begins, at) - 1
            length, item = found[place]
            at -= begins[place]
            if item.steady is not None:
                out.append(_Stretch(length - at, 1, item.steady))
                return out
            if not isinstance(item, Repeat):
                raise InternalError("a half-cycle without a level")
            size = length // item.times
            out.append(_Stretch(length - at, size, None))
            at, items = at % size, item.body

    def _index(self, items: Sequence[Item]) -> tuple[list[int], list[tuple[int, Item]]]:
        """Where each item begins, and it with its length; neighbours that keep one level are one."""
        known = self.indices.get(id(items))
        if known is not None:
            return known
        begins: list[int] = []
        found: list[tuple[int, Item]] = []
        at = 0
        for item in items:
            if found and item.steady is not None and found[-1][1].steady == item.steady:
                found[-1] = (found[-1][0] + item.length, found[-1][1])
            else:
                begins.append(at)
                found.append((item.length, item))
            at += item.length
        self.indices[id(items)] = begins, found
        return begins, found


def _agree(a: _Word, at_a: int, b: _Word, at_b: int, last: float) -> float:
    """For how many half-cycles, up to `last`, the outputs agree from these places on."""
    gone = 0
    while gone < last:
        left = last - gone
        here, there = a.stretches(at_a + gone), b.stretches(at_b + gone)
        best: tuple[float, int] | None = None
        for x, y in product(here, there):
            length = min(x.length, y.length, left)
            # Less than half of it may be walked instead, so walks within walks come to an end.
            if length > 2 * (x.period + y.period) and (best is None or length > best[0]):
                best = length, x.period + y.period
        if best is None:
            if here[-1].level != there[-1].level:
                return gone
            gone += int(min(here[-1].length, there[-1].length, left))
            continue
        length, walked = best
        agreed = _agree(a, at_a + gone, b, at_b + gone, walked)
        if agreed < walked:
            return gone + agreed
        if length == left:
            return last
        gone += int(length)
    return last


# -- lags --------------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Shifts:
    """All numbers of half-cycles by which one output is another one late.

    early    those below `lead`
    after    from `lead` on, those with this rest when divided by `period`; None if there are none
    """

    early: tuple[int, ...]
    lead: int
    after: int | None
    period: int

    def __contains__(self, lag: int) -> bool:
        if lag < self.lead:
            return lag in self.early
        return self.after is not None and lag % self.period == self.after


def shifts(orbit: Orbit, late: Orbit, effort: Effort) -> Shifts | None:
    """By how many half-cycles the output of `late` is that of `orbit`, late; None if both change too often to tell.

    Both orbits are closed. What `late` shows before it has begun is not looked at. Raises OutOfEffort."""
    wave = orbit.wave() or late.wave()
    if wave is None:
        return None
    period = wave.period or 1
    # Late or not, an output has the period of the other for ever once it is the same.
    if not (_repeats(orbit, period) and _repeats(late, period)):
        return Shifts((), 0, None, 1)
    if wave.stuck:
        return _constant(orbit, late)
    lead = late.lead_half_cycles
    found = []
    for lag in _candidates(orbit, late, lead + period):
        effort.check()
        if first_difference(orbit, late, lag) is None:
            found.append(lag)
    after = next((lag % period for lag in found if lag >= lead), None)
    return Shifts(tuple(lag for lag in found if lag < lead), lead, after, period)


def _repeats(orbit: Orbit, period: int) -> bool:
    """Whether the loop's output has a period."""
    loop = Orbit((), orbit.loop, orbit.widths)
    return first_difference(loop, loop, period) is None


ALIKE = 8
"""Runs of two outputs that are compared before the outputs are."""


def _constant(orbit: Orbit, late: Orbit) -> Shifts:
    """The shifts where the late output becomes constant."""
    edges = [at for at, _ in _edges(list(late.runs(1)))]
    constant = edges[-1] if edges else 0
    (_, first), *more = orbit.runs(1)
    likely = [at - first for at in edges if at >= first] if more else [constant]
    found = [lag for lag in likely if first_difference(orbit, late, lag) is None]
    return Shifts(
        tuple(lag for lag in found if lag < constant), constant, 0 if constant in found else None, 1
    )


def _candidates(orbit: Orbit, late: Orbit, ends: int) -> Iterator[int]:
    """Lags, in order, below `ends`, at which the first runs of the orbit are among those of the late one."""
    (_, first), *head = islice(orbit.runs(1 + ALIKE), ALIKE)
    runs: list[Run] = []
    at = more = 0
    for level, length in late.runs(2 * ALIKE + 2):
        runs.append((level, length))
        at += length
        more += at > ends + first
        if more > ALIKE:
            break
    for at, index in _edges(runs):
        if at - first >= ends:
            return
        if at >= first and runs[index : index + len(head)] == head:
            yield at - first


def _edges(runs: Sequence[Run]) -> Iterator[tuple[int, int]]:
    """Where each run but the first begins, and its index."""
    at = 0
    for index, (_, length) in enumerate(runs):
        if index:
            yield at, index
        at += length


def least_common(sets: Sequence[Shifts]) -> int | None:
    """The least lag that is in all of the sets; None if there is none."""
    longest = max(sets, key=lambda each: each.lead)
    for lag in longest.early:
        if all(lag in each for each in sets):
            return lag
    at, step = longest.lead, 1
    for each in sets:
        if each.after is None:
            return None
        # The numbers at, at + step, ... that leave this rest as well, by the Chinese remainder theorem.
        common = gcd(step, each.period)
        if (each.after - at) % common:
            return None
        size = each.period // common
        times = (each.after - at) // common * pow(step // common, -1, size) % size if size > 1 else 0
        at, step = at + times * step, step * size
    return at


# -- side by side ------------------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class Invariant:
    """What holds of both dividers together at every rest: each part is one bit over the variables of a Joint.

    `depth` half-cycles in a row in which it holds, and the outputs agree, are followed by one in which it does."""

    parts: tuple[Expr, ...]
    depth: int


def obligations(joint: Joint, claim: Invariant) -> Iterator[Obligation]:
    """What nothing may fulfil if the outputs agree for ever: the micro-steps' bounds; a start, or one of the first
    half-cycles after it, in which the invariant or the outputs fail; a run of `depth` half-cycles in which they hold,
    and then fail."""
    for number, goal in enumerate(joint.goals):
        yield Obligation(f"micro-steps, question {number}", goal)
    good = e.conj([*claim.parts, e.bvnot(joint.differs), e.bvnot(joint.differs_at_edge)])
    for start in joint.starts:
        yield Obligation(f"{start.cause}: the outputs differ", start.differs)
        state = list(start.first)
        for count in range(claim.depth):
            (holds,) = _at(joint, [good], state, f"start {count}")
            yield Obligation(f"{start.cause}, {count} half-cycles later: it fails", e.bvnot(holds))
            if count + 1 < claim.depth:
                state = _at(joint, joint.step, state, f"start {count}")
    state = [e.var(name, width) for name, width in joint.variables]
    before = e.TRUE
    for count in range(claim.depth):
        (holds,) = _at(joint, [good], state, f"{count}")
        before = e.bvand(before, holds)
        state = _at(joint, joint.step, state, f"{count}")
    (holds,) = _at(joint, [good], state, f"{claim.depth}")
    yield Obligation(
        f"it holds for {claim.depth} half-cycles and then fails", e.bvand(before, e.bvnot(holds))
    )


def _at(joint: Joint, values: Sequence[Expr], state: Sequence[Expr], label: str) -> list[Expr]:
    """Expressions in a state, with moves and choices of their own."""
    moves = {name: e.var(f"{name}/{label}", width) for name, width in joint.moves}
    return e.substitute(renamed(values, label), dict(zip(joint.names, state, strict=True)) | moves)


def invariant_faults(joint: Joint, claim: Invariant, effort: Effort) -> list[str]:
    """What is wrong with the claim that the invariant shows the outputs equal; empty if nothing is."""
    effort.say("checking what holds of both dividers together")
    known = {name for name, _ in joint.variables}
    if any(part.width != 1 or {v.name for v in e.variables([part])} - known for part in claim.parts):
        return ["an invariant over something else than the two dividers"]
    return [each.name for each in obligations(joint, claim) if not discharge(each, effort)]


STATED = 4096
"""Joint states up to which the set of them is stated as a formula."""


def in_set(joint: Joint, states: Collection[State]) -> Expr:
    """True of the states in a set, which are grouped by the clock and the first variables they share."""
    return _among([e.var(name, width) for name, width in joint.variables], sorted(states))


def _among(variables: Sequence[Expr], states: Sequence[State]) -> Expr:
    if not variables:
        return e.TRUE if states else e.FALSE
    groups: dict[tuple[State, ...], list[int]] = {}
    tails: dict[int, list[State]] = {}
    for first, *rest in states:
        tails.setdefault(first, []).append(tuple(rest))
    for first, following in tails.items():
        groups.setdefault(tuple(following), []).append(first)
    here, *others = variables
    out = e.FALSE
    for rests, values in groups.items():
        is_one = (
            e.TRUE
            if len(values) == 1 << here.width
            else e.disj(e.eq(here, e.const(v, here.width)) for v in values)
        )
        out = e.bvor(out, e.bvand(is_one, _among(others, rests)))
    return out


def reach_faults(joint: Joint, states: Collection[State], effort: Effort) -> list[str]:
    """What is wrong with the claim that both are in no other state together than these, and agree in all of them:
    every start and every step from them, with every value of what is free, is computed on arrays."""
    import numpy as np

    effort.say("checking the states that both can be in together")
    faults: list[str] = []
    for number, goal in enumerate(joint.goals):
        if not discharge(Obligation(f"micro-steps, question {number}", goal), effort):
            faults.append(f"micro-steps, question {number}")
    known = set(states)
    for cause, begun, differs in _begun(joint, effort):
        if differs or not begun <= known:
            faults.append(f"{cause}: not among the states")
    listed = sorted(known)
    kind = np.uint64 if all(width <= 64 for _, width in joint.variables) else object
    values = {
        name: np.array(column, dtype=kind)
        for name, column in zip(joint.names, zip(*listed, strict=True), strict=True)
    }
    free_names = [*joint.moves, *joint.choices]
    for chosen in product(*(range(1 << width) for _, width in free_names)):
        effort.check()
        for (name, _), value in zip(free_names, chosen, strict=True):
            values[name] = np.full(len(listed), value, dtype=kind)
        *after, rest, edge = e.arrays([*joint.step, joint.differs, joint.differs_at_edge], values)
        if rest.any() or edge.any():
            faults.append("a state in which the outputs differ")
        if not _rows(after) <= known:
            faults.append("a step out of the states")
    return list(dict.fromkeys(faults))


LISTED = 12
"""Bits that are not known of a start up to which it is computed with every value of them."""


def _begun(joint: Joint, effort: Effort) -> Iterator[tuple[str, set[State], bool]]:
    """How each start comes about, the states it begins in, and whether the outputs differ before."""
    for start in joint.starts:
        free = e.variables([*start.first, start.differs])
        if sum(v.width for v in free) > LISTED and joint.held is not None:
            yield "reset released", *_after_reset(joint, joint.held, effort)
            return
        columns = _every([(v.name, v.width) for v in free])
        *first, differs = e.arrays([*start.first, start.differs], columns)
        yield start.cause, _rows(first), bool(differs.any())


def _after_reset(joint: Joint, held: Held, effort: Effort) -> tuple[set[State], bool]:
    """The same by holding reset in every state at once, with every move of the inputs in every half-cycle."""
    clock = joint.names.index(joint.both.clock)
    names = [name for name, _ in joint.own]
    here = dict(_every(joint.own))
    here |= dict(zip(names, e.arrays(held.rest, here), strict=False))
    for _ in range(held.half_cycles):
        effort.check()
        here |= dict(zip(names, e.arrays(held.edge, here), strict=False)) | {
            names[clock]: 1 - here[names[clock]].astype("int64")
        }
        rows: set[State] = set()
        for moves in _moves(joint, len(here[names[0]])):
            after = dict(zip(names, e.arrays(held.move, here | moves), strict=False))
            inputs = {name.removesuffix(" moved"): value for name, value in moves.items()}
            rows |= _rows([(here | after | inputs)[name] for name in names])
        here = _columns(names, sorted(rows))
    here |= dict(zip(names, e.arrays(held.release, here), strict=False))
    found: set[State] = set()
    differs = False
    for moves in _moves(joint, len(here[names[0]])):
        *first, before = e.arrays(joint.begin, here | moves)
        found |= _rows(first)
        differs |= bool(before.any())
    return found, differs


def _moves(joint: Joint, length: int) -> Iterator[dict[str, np.ndarray]]:
    """Every move of the inputs, the same in so many rows."""
    import numpy as np

    for values in product(*(range(1 << width) for _, width in joint.moves)):
        yield {n: np.full(length, x, dtype=np.uint64) for (n, _), x in zip(joint.moves, values, strict=True)}


def _rows(columns: Sequence[np.ndarray]) -> set[State]:
    return set(zip(*(column.tolist() for column in columns), strict=True))


def _columns(names: Sequence[str], rows: Sequence[State]) -> dict[str, np.ndarray]:
    import numpy as np

    return {
        name: np.array(column, dtype=np.uint64)
        for name, column in zip(names, zip(*rows, strict=True), strict=True)
    }


def _every(free: Sequence[tuple[str, int]]) -> Mapping[str, np.ndarray]:
    """Every assignment to so few variables, as columns."""
    import numpy as np

    numbers = np.arange(1 << sum(width for _, width in free), dtype=np.uint64)
    out, at = {}, 0
    for name, width in free:
        out[name] = (numbers >> np.uint64(at)) & np.uint64((1 << width) - 1)
        at += width
    return out or {"": numbers}


# -- runs that differ --------------------------------------------------------------------------------------


def replayed(
    joint: Joint, start: Start, values: Model, moves: Sequence[State], ends: int
) -> tuple[Rest, ...]:
    """Both dividers run from a start for half-cycles 0 to `ends`, their inputs moving as told."""
    at_rest = dict(zip(joint.names, e.evaluate(start.rest, _zeros(start.rest) | values), strict=True))
    both = joint.both
    names = [name.removesuffix(" moved") for name, _ in joint.moves]
    inputs = dict(both.running.values) | {name: at_rest[name] for name in both.free}
    registers = {name: at_rest[name] for name in (*(r.name for r in both.design.registers), both.clock)}
    outputs = {name: both.design.signals[name].value for name in both.design.outputs}
    levels = e.evaluate(joint.outputs, _zeros(joint.outputs) | at_rest)
    first = Rest(0, False, inputs, registers, dict(zip(outputs, levels, strict=True)))
    wanted: list[Mapping[str, int] | None] = [dict(zip(names, move, strict=True)) for move in moves]
    wanted = (wanted + [None] * (ends + 1))[: ends + 1]
    return run(both.design, both.clock, outputs, first, wanted, joint.limit)


def _zeros(values: Sequence[Expr]) -> Model:
    return {v.name: 0 for v in e.variables(values)}


@dataclass(frozen=True, slots=True)
class Seen:
    """Where outputs differ in a run: the half-cycle of the later one, whether they do before inputs move in it, and
    the old and the new level."""

    half_cycle: int
    at_edge: bool
    levels: tuple[int, int]


def rests_differ(rests: Sequence[Rest], lag: int) -> Seen | None:
    """The first place in a run at which the new output, `lag` half-cycles late, is another than the old one was."""
    levels: dict[tuple[int, bool], tuple[int, ...]] = {}
    for rest in rests:
        levels[rest.half_cycle, False] = tuple(rest.outputs.values())
        if not rest.moved:
            levels[rest.half_cycle, True] = levels[rest.half_cycle, False]
    for half_cycle in range(abs(lag), rests[-1].half_cycle + 1):
        for at_edge in (True, False):
            old = levels[half_cycle - max(lag, 0), at_edge][0]
            new = levels[half_cycle - max(-lag, 0), at_edge][1]
            if old != new:
                return Seen(half_cycle, at_edge, (old, new))
    return None


def hangs_on_x(joint: Joint, rests: Sequence[Rest]) -> bool:
    """Whether a run of both is but one of several that x stands for."""
    both = joint.both
    expressions = [*both.design.all_expressions(), *joint.outputs]
    return any(v.name.startswith("?") for v in e.variables(expressions)) and not _certain(joint, rests)


def _certain(joint: Joint, rests: Sequence[Rest]) -> bool:
    """Whether each rest follows from the one before it, and shows its outputs, whatever x stands for."""
    from prover.system import Inputs, change_inputs, clock_edge

    both = joint.both
    widths = {r.name: r.width for r in both.design.registers} | dict(both.design.inputs)
    for before, after in zip([None, *rests], rests, strict=False):
        values = {**after.inputs, **after.registers}
        moment = {name: e.const(values[name], width) for name, width in widths.items()}
        shown = e.substitute(joint.outputs, moment)
        wanted: list[tuple[Expr, int]] = list(zip(shown, after.outputs.values(), strict=True))
        if before is not None:
            values = {**before.inputs, **before.registers}
            moment = {name: e.const(values[name], width) for name, width in widths.items()}
            if after.moved:
                moment = change_inputs(both.design, both.clock, moment, Inputs.of(after.inputs), joint.limit)
            else:
                moment = clock_edge(both.design, both.clock, moment, joint.limit)
            wanted += [(moment[name], value) for name, value in after.registers.items()]
        if any(constant(x) != value for x, value in wanted):
            return False
    return True


def trace_faults(joint: Joint, trace: Trace, lag: int) -> list[str]:
    """What is wrong with the claim that both dividers run as told and their outputs differ at its end; empty if
    nothing is."""
    from prover.trace import faults

    outputs = {name: joint.both.design.signals[name].value for name in joint.both.design.outputs}
    found = faults(joint.both.design, joint.both.clock, outputs, trace, joint.limit)
    seen = rests_differ(trace.rests, lag)
    if seen is None or seen.half_cycle != trace.rests[-1].half_cycle:
        found.append("the outputs do not differ at its end, or differ before")
    return found
