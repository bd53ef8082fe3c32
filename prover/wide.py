"""Wide machines from every power-up state: paths that cover all states, found by counterexample and widened.

The idea is a cover. Trace a start state into its loop with jumps; a jump through a counter's pass is one repeat,
extended backwards to where its stride no longer holds, so that one path covers every state of a counter's
overshoot. Then ask the solver for a power-up state that is on no path yet, nor gets on one within a few
half-cycles, trace that one, and go on until there is none (counterexample-guided widening). A state that joins a
path after j half-cycles at a place at least j from the path's start needs no longer than the path's own start, so
the worst recovery is that of some start, and exact.

A machine of which the last states need more steps than paths can be merged with, such as a ring with
correction, is unrolled for as many half-cycles as its worst start needs, which is found in the same way.

Cascades are taken in stages. A stage is a set of registers that depends on no other; the states of one stage are
covered under the assumption that the stages before it are on their loops, and the times add up.

Limits: membership in a path is a formula only where each repeat moves some register that no other repeat around
the same beat moves.
"""

from __future__ import annotations

import functools
from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import accumulate, product

from prover import certificate, orbit, path
from prover import expr as e
from prover.effort import Effort, OutOfEffort
from prover.errors import InternalError
from prover.expr import Expr
from prover.path import Beat, Item, Path, Repeat
from prover.rhythm import LONGEST_ROUND, Goal, Orbit
from prover.solve import find
from prover.system import State, System, project

MERGE = 4
"""Half-cycles within which a state has to join a path."""

UNROLLED = 320
"""Half-cycles up to which a machine is unrolled from all states."""

EARLY = 4
"""Half-cycles before a known good place within which a state is recognised as good by its output."""

PATIENCE = orbit.PATIENCE + 2
"""Rounds that a repeat has to gain backwards for a line to be traced anew: orbits follow fewer singly."""

DRAWN_BACK = 4
"""Times that a line is drawn out backwards."""

ASKED_FIRST = 5
REFINED = 12
"""Times that the slowest line's time is asked about, before and after a bound is known."""

FLAGS = 3
"""Registers of one bit that are tried at all levels together."""

COUNTER = 4
"""Bits of registers that depend on one another from which they make a stage of their own."""

MOST_ITEMS = 8000
"""Items of an orbit beyond which it is no part of a cover: that would be no shorter than its states."""

MOST_SINGLE = 400
"""Items of lead-ins up to which every place on them is asked about."""

WRITTEN = 60
"""Items of a lead-in up to which runs beside it are looked for."""

MOST_PATHS = 80
"""Paths in a cover beyond which it is given up."""


@dataclass(frozen=True, slots=True)
class Line:
    """An orbit with its recovery: half-cycles from its start until good, None if it never is.

    With a spread, of a count and a vector, it stands for that many orbits, each moved by the vector from the one
    before: their lead-ins run side by side and enter the loop at the same place."""

    orbit: Orbit
    recovery: int | None
    spread: tuple[int, State] | None = None


@dataclass(frozen=True, slots=True)
class Cover:
    """What is known of all power-up states of a system.

    lines   the orbits traced; together they meet every power-up state if `complete`
    worst   half-cycles within which every state recovers, None if some line never does or not complete
    slowest a start state that needs exactly `worst`, None if the bound may not be exact
    claims  what `certificate` has to check, a claim a stage; empty where it isn't complete
    why     what is missing where it isn't complete
    method  in words
    """

    lines: tuple[Line, ...]
    complete: bool
    worst: int | None
    slowest: State | None
    claims: tuple[certificate.Stage, ...]
    why: str
    method: str


# -- recovery along one orbit ------------------------------------------------------------------------------


def recovery_on(run: Orbit, period: int, high: int) -> int | None:
    """Half-cycles from the orbit's start until its wave is for ever `high` of every `period`; None if never."""
    wave = run.wave()
    if wave is None or path.changes(run.lead, LONGEST_ROUND) > LONGEST_ROUND:
        raise OutOfEffort("a round of too many changes of the output to be written out")
    if not Goal(period, high).fits(wave):
        return None
    # Walk back from the loop, run by run: the phase there fixes what every earlier half-cycle has to show.
    pieces = list(path.merged([*path.pieces(run.lead), *_two_rounds(run)]))
    begins = list(accumulate((size for _, size in pieces), initial=0))
    rise = first_rise(run)
    index = begins.index(rise) - 1
    edge, level = rise, 0
    while index >= 0:
        wanted = period - high if level == 0 else high
        piece_level, size = pieces[index]
        if piece_level != level:
            raise InternalError("runs that do not alternate")
        if size != wanted:
            # The tail of a longer run fits as far as the ideal run goes; a shorter one at the start fits whole.
            return max(edge - wanted, 0) if size > wanted else (0 if index == 0 else begins[index])
        edge -= size
        level = 1 - level
        index -= 1
    return 0


def _two_rounds(run: Orbit) -> Iterator[path.Run]:
    for _ in range(2):
        yield from path.pieces(run.loop)


def first_rise(run: Orbit) -> int:
    """A half-cycle at which the loop's wave rises, counted from the start. At the loop's entry the output may rise
    only because the lead-in was low, so that is no such half-cycle."""
    at, lead = 0, run.lead_half_cycles
    for index, (level, size) in enumerate(path.merged([*path.pieces(run.lead), *_two_rounds(run)])):
        if level == 1 and index > 0 and at > lead:
            return at
        at += size
    raise InternalError("a loop without a rise")


Axes = tuple[tuple[int, State], ...]
"""The repeats around a beat, outermost first: how many rounds, and what each adds."""


# -- membership --------------------------------------------------------------------------------------------


def on_beat(
    system: System, state: Sequence[Expr], beat: State, axes: Sequence[tuple[int, State]]
) -> Expr | None:
    """One bit: the state is the beat's for some indices of the repeats around it. None if that can't be said."""
    widths = [w for _, w in system.variables]
    parts: list[Expr] = []
    expected = [e.const(v, w) for v, w in zip(beat, widths, strict=True)]
    for number, (times, stride) in enumerate(axes):
        others = [s for i, (_, s) in enumerate(axes) if i != number]
        witness = _witness(stride, others, widths)
        if witness is None:
            return None
        width, step = widths[witness], stride[witness]
        shift = (step & -step).bit_length() - 1
        odd = step >> shift
        difference = e.bvsub(state[witness], e.const(beat[witness], width))
        if shift:
            difference = e.binary("bvlshr", difference, e.const(shift, width))
        index = e.bvmul(difference, e.const(pow(odd, -1, 1 << width), width))
        if shift:
            index = e.bvand(index, e.const((1 << (width - shift)) - 1, width))
        if times < 1 << width:
            parts.append(e.bvult(index, e.const(times, width)))
        for i, w in enumerate(widths):
            if stride[i]:
                scaled = e.bvmul(e.resize(index, w, False), e.const(stride[i], w))
                expected[i] = e.bvadd(scaled, expected[i])
    for i, (value, wanted) in enumerate(zip(state, expected, strict=True)):
        if not (len(axes) == 1 and _is_plain_witness(i, axes[0][1], widths)):
            parts.append(e.eq(value, wanted))
    return e.conj(parts)


def is_on_beat(state: State, beat: State, axes: Axes, widths: Sequence[int]) -> bool:
    """Whether the state is the beat's for some indices of the repeats around it. False where that can't be said."""
    expected = list(beat)
    for number, (times, stride) in enumerate(axes):
        others = [s for i, (_, s) in enumerate(axes) if i != number]
        witness = _witness(stride, others, widths)
        if witness is None:
            return False
        step, width = stride[witness], widths[witness]
        shift = (step & -step).bit_length() - 1
        difference = (state[witness] - beat[witness]) % (1 << width)
        index = (difference >> shift) * pow(step >> shift, -1, 1 << width) % (1 << (width - shift))
        if index >= times:
            return False
        expected = [x + index * d for x, d in zip(expected, stride, strict=True)]
    return all((x - v) % (1 << w) == 0 for x, v, w in zip(expected, state, widths, strict=True))


def _witness(stride: State, others: Sequence[State], widths: Sequence[int]) -> int | None:
    """The register from which a repeat's index can be read: moved by this repeat alone, by an odd step if any is."""
    found = [i for i, d in enumerate(stride) if d and not any(o[i] for o in others)]
    found.sort(key=lambda i: ((stride[i] & -stride[i]).bit_length(), -widths[i]))
    return found[0] if found else None


def _is_plain_witness(place: int, stride: State, widths: Sequence[int]) -> bool:
    """Whether the register equals its expectation by construction: the index was read from it, by an odd step."""
    return _witness(stride, (), widths) == place and stride[place] % 2 == 1


def placed_beats(items: Sequence[Item], at: int = 0, axes: Axes = ()) -> Iterator[tuple[int, State, Axes]]:
    """Every beat with the first half-cycle at which it comes, and the repeats around it."""
    for item in items:
        if isinstance(item, Beat):
            yield at, item.state, axes
        else:
            yield from placed_beats(item.body, at, (*axes, (item.times, item.stride)))
        at += item.length


def placed_spans(
    items: Sequence[Item], at: int = 0, last: int | None = None, axes: Axes = ()
) -> Iterator[tuple[int, State, Axes, int]]:
    """Every beat with the first and the last half-cycle at which it comes, and the repeats around it."""
    last = at if last is None else last
    for item in items:
        if isinstance(item, Beat):
            yield at, item.state, axes, last
        else:
            inner = item.length // item.times
            later = last + item.length - inner
            yield from placed_spans(item.body, at, later, (*axes, (item.times, item.stride)))
        at += item.length
        last += item.length


def peeled(items: Sequence[Item], widths: Sequence[int], rounds: int) -> Path:
    """The same path with the first rounds of every innermost repeat written out, and the first of every other."""
    out: list[Item] = []
    for item in items:
        if isinstance(item, Beat):
            out.append(item)
            continue
        inner = any(isinstance(part, Repeat) for part in item.body)
        body = peeled(item.body, widths, rounds)
        first = min(1 if inner else rounds, item.times)
        for i in range(first):
            out.extend(path.shifted(part, item.stride, i, widths) for part in body)
        if item.times > first:
            rest = tuple(path.shifted(part, item.stride, first, widths) for part in body)
            out.append(Repeat(item.times - first, item.stride, rest))
    return tuple(out)


def shortened(items: Sequence[Item], widths: Sequence[int], keep: int) -> Path:
    """The same path with cycles before and after a repeat drawn into it where they fit its stride, but for the
    first `keep` half-cycles."""
    out: list[Item] = []
    at = 0
    for item in items:
        out.append(item)
        at += item.length
        while len(out) >= 3 and isinstance(out[-1], Repeat) and at - out[-1].length - 2 >= keep:
            block = out[-1]
            size = len(block.body)
            before = out[-1 - size : -1]
            if len(before) < size or not _fits_before(before, block, widths):
                break
            earlier = tuple(path.shifted(i, block.stride, -1, widths) for i in block.body)
            out[-1 - size :] = [Repeat(block.times + 1, block.stride, earlier)]
        while len(out) >= 2:
            joined = _drawn_in(out, widths)
            if joined is None:
                break
            out = joined
    return tuple(out)


def _fits_before(before: Sequence[Item], block: Repeat, widths: Sequence[int]) -> bool:
    return all(
        a == path.shifted(b, block.stride, -1, widths) for a, b in zip(before, block.body, strict=True)
    )


def _drawn_in(out: list[Item], widths: Sequence[int]) -> list[Item] | None:
    """The items with what follows a repeat drawn into it, if it is one more round of it."""
    for back in range(1, min(len(out), orbit.BLOCK)):
        block = out[-1 - back]
        if not isinstance(block, Repeat):
            continue
        if len(block.body) != back:
            return None
        wanted = tuple(path.shifted(i, block.stride, block.times, widths) for i in block.body)
        if tuple(out[-back:]) != wanted:
            return None
        return [*out[: -1 - back], Repeat(block.times + 1, block.stride, block.body)]
    return None


def _repeats(items: Sequence[Item]) -> Iterator[Repeat]:
    """Every repeat, the outer ones first."""
    for item in items:
        if isinstance(item, Repeat):
            yield item
            yield from _repeats(item.body)


# -- the cover ---------------------------------------------------------------------------------------------


class _Cover:
    """Lines traced so far, with the formulas of the places on them."""

    def __init__(self, system: System, goal: Goal | None, assumed: Expr, effort: Effort) -> None:
        self.system = system
        self.goal = goal
        self.assumed = assumed
        self.effort = effort
        self.widths = [w for _, w in system.variables]
        self.lines: list[Line] = []
        self.loops: set[frozenset[Item]] = set()
        self.widening = False
        self.unrolled = UNROLLED
        self.known: orbit.Places = {}
        # The lines that sufficed when no state was last found late, and what was asked then.
        self.sufficient: tuple[Line, ...] = ()
        self.merge = EARLY
        # By identity: a line's hash would walk its whole path. The line is kept, so that its id stays its own.
        self.placed: dict[int, tuple[Line, list[tuple[int, State, Axes]]]] = {}

    def add(self, start: State) -> Line:
        """Take a start state's line into the cover, and the line that widens it; the slower of the two."""
        run = self._traced(start)
        line = self._line(run)
        passes = any(isinstance(item, Repeat) for item in run.lead)
        early = self._earliest(run) if self.widening or passes else run
        if early is run or line.recovery is None:
            self.lines.append(line)
            return line
        wider = self._line(early)
        self.lines.append(wider)
        if not self.has(start):
            self.lines.append(line)
        slower = wider.recovery is None or wider.recovery > line.recovery
        return wider if slower else line

    def widen(self) -> None:
        """From now on let lines stand for as many states as they can."""
        self.widening = True
        self.lines = [self._line(line.orbit) for line in self.lines]

    def _line(self, run: Orbit) -> Line:
        recovery: int | None = run.lead_half_cycles
        if self.goal is not None:
            recovery = recovery_on(run, self.goal.period, self.goal.high)
        if recovery is None or not self.widening:
            return Line(run, recovery)
        low, spread = self._spread(run)
        return Line(low, recovery, spread)

    def _spread(self, run: Orbit) -> tuple[Orbit, tuple[int, State] | None]:
        """The lowest of the runs that lie beside this one, and how many there are: a register that the lead-in
        holds, and the loop forgets, may have any of a range of values."""
        if len(run.lead) > WRITTEN:
            return run, None
        beats = list(path.beats(run.lead))
        strides = [item.stride for item in _repeats(run.lead)]
        for place, width in enumerate(self.widths):
            held = len({beat.state[place] for beat in beats}) == 1 and not any(d[place] for d in strides)
            if width == 1 or not held or not beats:
                continue
            counts = []
            for direction in (-1, 1):
                stride = tuple(direction % (1 << w) if i == place else 0 for i, w in enumerate(self.widths))
                beside = functools.partial(self._broken_beside, run, stride)
                counts.append(orbit.least(beside, width, 1 << width, self.effort) - 1)
            if sum(counts):
                down = tuple(
                    (1 << w) - counts[0] if i == place and counts[0] else 0 for i, w in enumerate(self.widths)
                )
                lead = tuple(path.shifted(item, down, 1, self.widths) for item in run.lead)
                up = tuple(int(i == place) for i in range(len(self.widths)))
                many = min(sum(counts) + 1, 1 << width)
                return replace(run, lead=lead), (many, up)
        return run, None

    def _broken_beside(self, run: Orbit, stride: State, count: Expr) -> Expr:
        """True of a number for which the lead-in, moved that many times by the stride, is no run into the loop."""
        broken = []
        for source, target in certificate.lead_steps(self.system, run, count, stride):
            broken.append(certificate.differs(self.system, source, target))
        return e.disj(broken)

    def _traced(self, start: State) -> Orbit:
        run = orbit.trace(self.system, start, self.effort, self.known, MOST_ITEMS)
        if not run.closed:
            raise OutOfEffort(run.why)
        if self.system.choices and certificate.orbit_faults(self.system, run, self.effort):
            raise OutOfEffort("an orbit hangs on a value that x stands for")
        if frozenset(run.loop) not in self.loops:
            run = replace(run, loop=shortened(run.loop, self.widths, 0))
            self.loops.add(frozenset(run.loop))
            self.known = orbit.onward(run.loop) | self.known
        return self._entered(run)

    def _entered(self, run: Orbit) -> Orbit:
        """The run with the least lead-in: a jump may carry it past the place where it enters its loop."""
        places = list(placed_beats(run.loop))
        if len(places) > MOST_SINGLE or not any(isinstance(item, Repeat) for item in run.lead):
            return run
        low, high = 0, run.lead_half_cycles
        while low < high:
            middle = (low + high) // 2
            if self._is_on(run.state(middle), ((beat, axes) for _, beat, axes in places)):
                high = middle
            else:
                low = middle + 1
        if high == run.lead_half_cycles:
            return run
        # From there on the lead-in is the loop's own states, and ends where the loop is written to begin.
        round_ = run.loop_half_cycles
        before, after = path.split(run.loop, -(run.lead_half_cycles - high) % round_, self.widths)
        return Orbit(path.split(run.lead, high, self.widths)[0], (*after, *before), run.widths)

    def _earliest(self, run: Orbit) -> Orbit:
        """The run drawn out backwards: along its repeats' strides, and by single steps, while that leads on."""
        for _ in range(DRAWN_BACK):
            start = self._before_repeat(run)
            if start is None:
                start = self._predecessor(run)
            if start is None or not _holds(self.system, self.assumed, start):
                return run
            run = self._traced(start)
        return run

    def _before_repeat(self, run: Orbit) -> State | None:
        """The farthest state from which the longest of the first repeats is reached by its own stride."""
        blocks = [i for i in run.lead[:40] if isinstance(i, Repeat) and i.times > 3]
        for block in sorted(blocks, key=lambda i: -i.length):
            # Going backwards is a repeat of the same body by the opposite stride.
            stride = tuple(-d & ((1 << w) - 1) for d, w in zip(block.stride, self.widths, strict=True))
            rounds = orbit.least_break_backwards(self.system, block, stride, self.effort)
            if rounds > PATIENCE:
                return path.moved(path.first_state(block.body), stride, rounds - 1, self.widths)
        return None

    def _predecessor(self, run: Orbit) -> State | None:
        """A state that steps to the run's start, unless the start is on the run's loop."""
        if not run.lead:
            return None
        parts = [self.assumed]
        for value, wanted in zip(self.system.step, run.start, strict=True):
            parts.append(e.eq(value, e.const(wanted, value.width)))
        model = find(e.conj(parts), self.effort)
        return None if model is None else tuple(model.get(name, 0) for name in self.system.names)

    def outside(self, merge: int) -> Expr:
        """True of a power-up state that gets on no line within `merge` half-cycles."""
        state: list[Expr] = [e.var(name, width) for name, width in self.system.variables]
        parts = [self.assumed]
        for j in range(merge + 1):
            parts.append(e.bvnot(self.member(state, j)))
            if j < merge:
                values = dict(zip(self.system.names, state, strict=True))
                state = e.substitute(list(self.system.step), values)
        return e.conj(parts)

    def member(self, state: Sequence[Expr], least: int | None) -> Expr:
        """True of a state on some line where it is good, or at a place at least `least` half-cycles from its start
        (None: nowhere else)."""
        formulas = (on_beat(self.system, state, beat, axes) for beat, axes in self._where(least))
        return e.disj(formula for formula in formulas if formula is not None)

    def _where(self, least: int | None) -> Iterable[tuple[State, Axes]]:
        """Places on the lines where a state is good, or at least that far from a line's start. Where only good ones
        are wanted, single ones far from the loop are left out: they are many, and decide nothing."""
        places: dict[tuple[State, Axes], None] = {}
        few = sum(len(line.orbit.lead) for line in self.lines) <= MOST_SINGLE
        for line in self._distinct():
            lead = line.orbit.lead_half_cycles
            for at, beat, axes in self._places(line):
                if line.spread and at < lead:
                    axes = (*axes, line.spread)
                good = line.recovery is not None and at >= line.recovery
                if least is None and not few and not axes and at < lead - EARLY:
                    good = False
                if good or (least is not None and at >= least):
                    places[beat, axes] = None
        return places

    def late_after(self, bound: int, merge: int) -> State | None:
        """A state that after `bound` half-cycles is not known to be good, nor known to have been so by where it is at
        most (from EARLY on: exactly) `merge` half-cycles later."""
        self.effort.say(f"following all states for {bound} half-cycles")
        clock = self.system.clock
        for level in (0, 1):
            fixed = {clock: e.const(level, 1)}
            (assumed,) = e.substitute([self.assumed], fixed)
            state = [fixed.get(n, e.var(n, w)) for n, w in self.system.variables]
            state, _ = self._ahead(state, bound)
            model = find(e.bvand(assumed, e.bvnot(self._known_good(state, merge))), self.effort)
            if model is not None:
                model[clock] = level
                return tuple(model.get(name, 0) for name in self.system.names)
        self.sufficient, self.merge = tuple(self.lines), merge
        return None

    def _ahead(self, state: list[Expr], count: int) -> tuple[list[Expr], list[Expr]]:
        """The state `count` half-cycles on, and the output's levels until then."""
        levels = []
        for _ in range(count):
            values = dict(zip(self.system.names, state, strict=True))
            *state, level = e.substitute([*self.system.step, self.system.output], values)
            levels.append(level)
        return state, levels

    def _known_good(self, state: list[Expr], merge: int) -> Expr:
        """True of a state on a line where that is good, or that comes there within `merge` half-cycles (at their end,
        where they are more than EARLY) while the output is as the phase of that place wants it."""
        parts = [self.member(state, None)] if merge <= EARLY else []
        levels: list[Expr] = []
        for count in range(1, merge + 1 if self.goal is not None else 1):
            state, more = self._ahead(state, 1)
            levels += more
            if merge <= EARLY or count == merge:
                parts.append(self._good_behind(state, levels))
        return e.disj(parts)

    def _good_behind(self, state: Sequence[Expr], levels: Sequence[Expr]) -> Expr:
        """True of a state on a good place of a loop, where the levels before it are what the wave has there."""
        places: dict[tuple[State, Axes, tuple[int, ...]], None] = {}
        for line in self._distinct():
            lead, rise = line.orbit.lead_half_cycles, first_rise(line.orbit)
            loop = peeled(line.orbit.loop, self.widths, EARLY // 2)
            for at, beat, axes, last in placed_spans(loop, lead):
                before = self._levels_before(at - rise, last - rise, axes, len(levels))
                if before is not None:
                    places[beat, axes, before] = None
        parts = []
        for beat, axes, wanted in places:
            formula = on_beat(self.system, state, beat, axes)
            if formula is not None:
                fits = [e.eq(x, e.const(v, 1)) for x, v in zip(levels, wanted, strict=True)]
                parts.append(e.conj([*fits, formula]))
        return e.disj(parts)

    def _levels_before(self, first: int, last: int, axes: Axes, count: int) -> tuple[int, ...] | None:
        """The wave's `count` levels before phases `first` to `last`, if they are the same for all of these."""
        assert self.goal is not None
        period, high = self.goal.period, self.goal.high
        begins = first - count
        same_run = (begins % period < high) == (last % period < high) and (last - begins) < period
        whole = same_run and (begins % period) + (last - begins) < (
            high if begins % period < high else period
        )
        if axes and not whole:
            return None
        return tuple(int((begins + i) % period < high) for i in range(count))

    def has(self, state: State) -> bool:
        """Whether the state is on a line."""
        return self._is_on(state, self._where(0))

    def _is_on(self, state: State, places: Iterable[tuple[State, Axes]]) -> bool:
        return any(beat == state or is_on_beat(state, beat, axes, self.widths) for beat, axes in places)

    def lost(self) -> Cover:
        why = "a state that never becomes good"
        return Cover(tuple(self.lines), False, None, None, (), why, "path of a lost state")

    def given_up(self, why: str) -> Cover:
        return Cover(tuple(self.lines), False, None, None, (), why, "")

    def proved(
        self, worst: int, slowest: Line | None, unrolled: int | None, merge: int, method: str
    ) -> Cover:
        """The cover with the claim that it is one."""
        lines = self.lines if unrolled is None else self._needed()
        claim = certificate.CoverClaim(
            orbits=tuple(self._claimed(line.orbit, unrolled is not None) for line in lines),
            recoveries=tuple(line.recovery or 0 for line in lines),
            spreads=tuple(line.spread for line in lines),
            unrolled=unrolled,
            merge=merge,
            bound=worst,
            period=self.goal.period if self.goal else 0,
            high=self.goal.high if self.goal else 0,
        )
        start = slowest.orbit.start if slowest else None
        claims = (certificate.Stage(self.system, claim),)
        return Cover(tuple(self.lines), True, worst, start, claims, "", method)

    def _needed(self) -> list[Line]:
        """What a claim about unrolled states rests on: each loop once, and the lead-ins that are families."""
        loops = {frozenset(line.orbit.loop): line.orbit.loop for line in self.sufficient}
        plain = [Line(Orbit((), loop, self.lines[0].orbit.widths), 0) for loop in loops.values()]
        near = [self._cut(line) for line in self.sufficient if line.orbit.lead]
        return plain + near

    def _cut(self, line: Line) -> Line:
        """The line without the single half-cycles before it is near its loop or on a repeat."""
        lead = list(line.orbit.lead)
        if line.spread or sum(len(other.orbit.lead) for other in self.sufficient) <= MOST_SINGLE:
            return line
        while lead and isinstance(lead[0], Beat) and path.length(lead) > EARLY:
            del lead[0]
        cut = line.orbit.lead_half_cycles - path.length(lead)
        return Line(replace(line.orbit, lead=tuple(lead)), max((line.recovery or 0) - cut, 0))

    def _claimed(self, run: Orbit, phases: bool) -> Orbit:
        """The orbit as the claim writes it: cycles drawn into repeats, the first rounds of the loop's written out."""
        lead = shortened(run.lead, self.widths, MERGE + 2)
        loop = run.loop
        if self.goal is not None and phases:
            loop = peeled(loop, self.widths, EARLY // 2)
        return Orbit(lead, loop, run.widths)

    def _distinct(self) -> Iterator[Line]:
        """The lines, those that have nothing but a loop that another has too left out."""
        seen: set[frozenset[Item]] = set()
        for line in self.lines:
            loop = frozenset(line.orbit.loop)
            if line.orbit.lead or loop not in seen:
                yield line
            seen.add(loop)

    def _places(self, line: Line) -> list[tuple[int, State, Axes]]:
        """Every place on the line, with the half-cycle at which it first comes."""
        if id(line) not in self.placed:
            self.placed[id(line)] = (line, self._placed(line))
        return self.placed[id(line)][1]

    def _placed(self, line: Line) -> list[tuple[int, State, Axes]]:
        lead = shortened(line.orbit.lead, self.widths, MERGE + 2)
        loop = line.orbit.loop
        total = line.orbit.lead_half_cycles
        return [*placed_beats(lead), *((at + total, s, a) for at, s, a in placed_beats(loop))]


def cover(
    system: System,
    goal: Goal | None,
    assumed: Expr,
    seeds: Sequence[State],
    effort: Effort,
    unrolled: int = UNROLLED,
) -> Cover:
    """Lines that every state under the assumption gets on, or as far as the effort goes. The machine is unrolled from
    all states for so many half-cycles at most.

    Without a goal the time that counts is that until a loop is entered. With one, a line that is not good ends
    the search at once: its start is lost, and that decides every property that asks for all states to be good.
    """
    made = _Cover(system, goal, assumed, effort)
    made.unrolled = unrolled
    try:
        for seed in seeds:
            if _holds(system, assumed, seed) and not made.has(seed) and made.add(seed).recovery is None:
                return made.lost()
        found = _by_unrolling(made)
        if found is not None:
            return found
        for seed in _beyond(made):
            if _holds(system, assumed, seed) and not made.has(seed) and made.add(seed).recovery is None:
                return made.lost()
        return _by_lines(made)
    except OutOfEffort as out:
        return made.given_up(str(out))


def _beyond(made: _Cover) -> Iterator[State]:
    """States that are on a loop but for one counter, which is just beyond its end there: it may have the longest way
    back. Single bits and the clock are taken at either level, just after its rising edge first."""
    names, widths = made.system.names, made.widths
    loops = {frozenset(line.orbit.loop): line.orbit.loop for line in made.lines}
    flags = [
        i
        for i, (name, w) in enumerate(zip(names, widths, strict=True))
        if w == 1 and name != made.system.clock
    ]
    levels = (
        list(product((0, 1), repeat=len(flags)))
        if len(flags) <= FLAGS
        else [(0,) * len(flags), (1,) * len(flags)]
    )
    for loop in loops.values():
        start = path.first_state(loop)
        for place, width in enumerate(widths):
            if width < COUNTER:
                continue
            low, high = _range(loop, place, width)
            for value, clock, flag in product((high + 1, low - 1), (1, 0), levels):
                if 0 <= value < 1 << width:
                    other = {place: value, len(widths) - 1: clock, **dict(zip(flags, flag, strict=True))}
                    yield tuple(other.get(i, v) for i, v in enumerate(start))


def _range(loop: Sequence[Item], place: int, width: int) -> tuple[int, int]:
    """The least and the greatest value of a register on a loop, as far as no repeat wraps round."""
    low, high = 1 << width, -1
    for _, state, axes in placed_beats(loop):
        least = most = state[place]
        for times, stride in axes:
            step = stride[place] - (1 << width if stride[place] >> (width - 1) else 0)
            least, most = least + min(step, 0) * (times - 1), most + max(step, 0) * (times - 1)
        low, high = min(low, least), max(high, most)
    return low, high


# -- stages ------------------------------------------------------------------------------------------------


def cover_in_stages(
    system: System, goal: Goal | None, seeds: Sequence[State], effort: Effort, unrolled: int = UNROLLED
) -> Cover | None:
    """The cover of a cascade, stage by stage; None if the registers do not fall into several stages. Each stage is
    unrolled for so many half-cycles at most."""
    parts = stages(system)
    if len(parts) < 2:
        return None
    claims: list[certificate.Stage] = []
    slowest: dict[str, int] = {}
    total, exact = 0, True
    for names in parts:
        last = names is parts[-1]
        stage = system if last else certificate.part(system, names)
        assumed = certificate.assumption(stage, claims[-1] if claims else None)
        starts = [project(system, seed, stage) for seed in seeds]
        found = cover(stage, goal if last else None, assumed, starts, effort, unrolled)
        if not found.claims or found.worst is None:
            return found if last else None
        claims += found.claims
        total += found.worst
        exact = exact and found.slowest is not None
        if found.slowest is not None:
            ours = zip(stage.names, found.slowest, strict=True)
            slowest = {name: value for name, value in ours if found.worst or not last} | slowest
    method = (
        f"{len(parts)} stages of registers, each covered with those before it on their loops: {found.method}"
    )
    start = _start_that_needs(system, goal, slowest, found.lines, total, effort) if exact else None
    return Cover(found.lines, True, total, start, tuple(claims), "", method)


def _start_that_needs(
    system: System,
    goal: Goal | None,
    values: dict[str, int],
    lines: Sequence[Line],
    total: int,
    effort: Effort,
) -> State | None:
    """A state that really needs that long: the stages' slowest values together or, where the last stage is good at
    once, those of the stages before it with the last one's where the output has just changed."""
    if goal is None:
        return None
    names = system.names
    found = [tuple(values[name] for name in names)] if values.keys() >= set(names) else []
    for line in lines:
        changes = [first_rise(line.orbit), first_rise(line.orbit) + goal.high]
        for state in map(line.orbit.state, changes):
            found.append(tuple(values.get(n, v) for n, v in zip(names, state, strict=True)))
    for start in dict.fromkeys(found):
        if not _holds(system, system.settled, start):
            continue
        run = orbit.trace(system, start, effort, most=MOST_ITEMS)
        if run.closed and recovery_on(run, goal.period, goal.high) == total:
            return None if certificate.orbit_faults(system, run, effort) else start
    return None


def stages(system: System) -> list[set[str]]:
    """Growing sets of registers, none of which depends on others: a new one for each counter that is added.

    The registers that depend on one another (the strongly connected components of the dependency graph) stay
    together; small ones are added with the next counter, the rest last."""
    needs = {
        name: [v.name for v in e.variables([step]) if not v.name.startswith("?")]
        for name, step in zip(system.names, system.step, strict=True)
    }
    widths = dict(system.variables)
    out: list[set[str]] = []
    taken: set[str] = {system.clock}
    for component in components(needs):
        taken |= set(component)
        if sum(widths[name] for name in component) >= COUNTER:
            out.append(set(taken))
    if out:
        out[-1] = set(system.names)
    return out


def components(needs: Mapping[str, Sequence[str]]) -> list[list[str]]:
    """Strongly connected components, those needed before those that need them (Tarjan 1972, without recursion)."""
    index: dict[str, int] = {}
    low: dict[str, int] = {}
    stack: list[str] = []
    on_stack: set[str] = set()
    out: list[list[str]] = []
    for root in needs:
        if root in index:
            continue
        work = [(root, iter(needs[root]))]
        index[root] = low[root] = len(index)
        stack.append(root)
        on_stack.add(root)
        while work:
            name, rest = work[-1]
            for other in rest:
                if other not in index:
                    index[other] = low[other] = len(index)
                    stack.append(other)
                    on_stack.add(other)
                    work.append((other, iter(needs[other])))
                    break
                if other in on_stack:
                    low[name] = min(low[name], index[other])
            else:
                work.pop()
                if work:
                    low[work[-1][0]] = min(low[work[-1][0]], low[name])
                if low[name] == index[name]:
                    at = stack.index(name)
                    out.append(stack[at:])
                    on_stack -= set(stack[at:])
                    del stack[at:]
    return out


def _by_unrolling(made: _Cover) -> Cover | None:
    """All states followed for as many half-cycles as the slowest one needs; None if that is too many.

    First the slowest known line's time is asked about as it is. If that goes on being too short, a time after
    which all are where a line is good is found by galloping and bisection, and then again the slowest line's
    own time is asked about."""
    found = _slowest_suffices(made, ASKED_FIRST)
    if found is None and not _too_slow(made):
        high = _least_time(made)
        if high is not None:
            found = _narrowed(made, high)
    return made.lost() if any(line.recovery is None for line in made.lines) else found


def _too_slow(made: _Cover) -> bool:
    late = any(line.recovery is None or line.recovery > made.unrolled for line in made.lines)
    return late or len(made.lines) >= MOST_PATHS


def _slowest_suffices(made: _Cover, tries: int) -> Cover | None:
    """The cover if every state is good after the time that the slowest line needs; each try adds a line."""
    for _ in range(tries):
        if _too_slow(made):
            return None
        slowest = max(made.lines, key=lambda line: line.recovery or 0, default=None)
        worst = (slowest.recovery or 0) if slowest else 0
        late = made.late_after(worst, EARLY)
        if late is None:
            return made.proved(worst, slowest, worst, made.merge, _after(worst))
        # Either a slower state, or one that is good by then and was not known to be.
        made.add(late)
    return None


def _least_time(made: _Cover) -> int | None:
    """The least time after which every state is at a good place of a line; None if it is too long."""
    low, high, bound = -1, made.unrolled + 1, 2
    while low + 1 < high:
        late = made.late_after(bound, 0)
        if late is None:
            high = bound
        else:
            made.add(late)
            if _too_slow(made) or bound >= made.unrolled:
                return None
            low = bound
        bound = min(2 * bound + 2, made.unrolled) if high > made.unrolled else (low + high) // 2
    return high


def _narrowed(made: _Cover, high: int) -> Cover | None:
    """The bound brought down to what the slowest line needs.

    By `settled` half-cycles every state is on a loop, where its phase is known, so its output from any time on until
    then can be held against what that phase wants: what differs shows a state that needs longer than that time."""
    settled = high
    for _ in range(REFINED):
        slowest = max(made.lines, key=lambda line: line.recovery or 0)
        worst = slowest.recovery or 0
        if _too_slow(made):
            return None
        if worst >= high:
            break
        middle = (worst + high) // 2
        late = made.late_after(middle, settled - middle)
        if late is None:
            high = middle
        else:
            settled = max(settled, min(made.add(late).orbit.lead_half_cycles, made.unrolled))
    exact = slowest.recovery == high
    return made.proved(high, slowest if exact else None, high, made.merge, _after(high))


def _after(bound: int) -> str:
    return f"after {bound} half-cycles every power-up state is on a known good run (solver)"


def _by_lines(made: _Cover) -> Cover:
    """Lines added until every state gets on one within a few half-cycles."""
    made.widen()
    while True:
        made.effort.say(f"looking for a state outside {len(made.lines)} paths")
        model = find(made.outside(MERGE), made.effort)
        if model is None:
            break
        if len(made.lines) >= MOST_PATHS:
            return made.given_up(f"more than {MOST_PATHS} paths")
        if made.add(tuple(model.get(name, 0) for name in made.system.names)).recovery is None:
            return made.lost()
    merge = _joined_within(made)
    if merge is None:
        return made.lost()
    slowest = max(made.lines, key=lambda line: line.recovery or 0)
    # A state that joins a path where it is good already may need as long as joining takes.
    needed = slowest.recovery or 0
    method = (
        f"every power-up state is on one of {len(made.lines)} traced paths or joins one within {merge} "
        "half-cycles (solver)"
    )
    worst = max(needed, merge)
    return made.proved(worst, slowest if worst == needed else None, None, merge, method)


def _joined_within(made: _Cover) -> int | None:
    """Half-cycles within which every state joins a line: what the slowest line needs if that is less than MERGE, for
    which a few more lines are added, else the fewest that will do. None if a line is found that is never good."""
    for _ in range(ASKED_FIRST):
        needed = max(line.recovery or 0 for line in made.lines)
        model = find(made.outside(needed), made.effort) if needed < MERGE else None
        if model is None:
            return min(needed, MERGE)
        if made.add(tuple(model.get(name, 0) for name in made.system.names)).recovery is None:
            return None
    return next((m for m in range(needed, MERGE) if find(made.outside(m), made.effort) is None), MERGE)


def _holds(system: System, assumed: Expr, state: State) -> bool:
    return e.evaluate([assumed], dict(zip(system.names, state, strict=True))) == [1]
