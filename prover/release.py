"""Reset released: every way in which it can come about, and what the output does from then on.

A release comes between two edges, at either level of the clock, and is followed from every state that reset leaves.
In hardware the flip-flops need not see it before the same edge: where its release misses recovery or removal at one
of them, that one sees it an edge later. Such a flip-flop is modelled by a shadow of its register, which goes on
seeing reset through the next edge; one bit of the register is taken from the shadow. Each bit is tried by itself.

Nothing here searches. What is followed from where it ends here is for `analyse`, and for `rebuild` out of a
certificate.

    Freed     one release, and the run after it
    Pulse     a stretch of the output between two edges, in halves of a half-cycle
    Release   all of it together, and how long reset has to be held
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import chain, islice, zip_longest

from prover import expr as e
from prover import path
from prover.design import Design, Edge, Register
from prover.errors import InternalError
from prover.expr import Expr
from prover.path import Run
from prover.ports import Ports
from prover.reset import Held, filled, known, released_from, seen_by
from prover.rhythm import LONGEST_ROUND, Orbit, Wave
from prover.system import Inputs, Moment, State, System, unroll
from prover.trace import Trace, faults, rest_of, run

UNITS = 2
"""Halves of a half-cycle in a half-cycle: inputs move in its middle."""

LATE = "!late"
"""The reset as the shadows see it."""

SHADOW, MASK = "!late.", "!mask."
"""What stands before a register's name for its shadow, and for the bits that are taken from there."""

MOST_STATES = 64
"""States that reset leaves up to which a flip-flop is released late from each."""

LONGEST_SHORT = 1024
"""Input cycles of reset up to which it is followed whether they are too few."""

LONGEST_TRACE = 600
"""Half-cycles up to which a trace is written out."""

SHORTEST, AFTERWARDS = 12, 4
"""Half-cycles that a trace shows after the release at least, and after what is broken."""


@dataclass(frozen=True, slots=True)
class Flop:
    """One bit of a register."""

    register: str
    bit: int
    width: int

    def __str__(self) -> str:
        return self.register if self.width == 1 else f"bit {self.bit} of {self.register}"


@dataclass(frozen=True, slots=True)
class Freed:
    """A release of reset, and the run after it.

    States are those of the registers that the output depends on, and of the clock (see `reset.Held`).

    start    the state from which on reset is held, for `held` half-cycles
    under    the state under reset just before the release
    before   the output then
    early    the output from the release on in halves of a half-cycle, as long as a flip-flop is late
    state    the state when all is released, in the middle of a half-cycle
    flop     the flip-flop that is released an edge later, None if all are released together
    orbit    the run from that state on; None until it is followed
    wave     what it runs into; None where that is not known
    right    whether the wave is known to be right from that state on, though it is not written out
    """

    start: State
    held: int
    under: State
    before: int
    early: tuple[int, ...]
    state: State
    flop: Flop | None = None
    orbit: Orbit | None = None
    wave: Wave | None = None
    right: bool = False

    def followed(self, orbit: Orbit | None, wave: Wave | None) -> Freed:
        """The same with its run."""
        return replace(self, orbit=orbit, wave=wave)

    @property
    def clock(self) -> int:
        """The clock's level at the release."""
        return self.under[-1]

    @property
    def cause(self) -> str:
        text = f"reset released while the clock is {'high' if self.clock else 'low'}"
        return f"{text}, {self.flop} an edge later" if self.flop else text


@dataclass(frozen=True, slots=True)
class Pulse:
    """A stretch of the output between two edges: when it begins, from the release on, and how long it is, both in
    halves of a half-cycle."""

    level: int
    begins: int
    length: int


@dataclass(frozen=True, slots=True)
class Release:
    """What reset does to a divider.

    ports      the divider's
    limit      micro-steps within which all settles, reset or not
    held       how long reset has to be held, and the states that it leaves
    levels     the output while reset is held, in those states
    on_time    the releases of all flip-flops together, from each of those states
    late       the releases with one flip-flop an edge later, those that end elsewhere than on time
    flops      the number of flip-flops that see the reset
    short      the release after as many input cycles as the user holds reset for, where they are too few and it shows
    open       why nothing is known, or not all; "" otherwise
    """

    ports: Ports
    limit: int
    held: Held
    levels: tuple[int, ...] = ()
    on_time: tuple[Freed, ...] = ()
    late: tuple[Freed, ...] = ()
    flops: int = 0
    short: Freed | None = None
    open: str = ""

    @property
    def runs(self) -> tuple[Freed, ...]:
        """All releases."""
        return (*self.on_time, *self.late, *((self.short,) if self.short else ()))


# -- releases ----------------------------------------------------------------------------------------------


class _Unknown(Exception):
    """What a release leads to is not known; the message says why."""


def unknown(ports: Ports, why: str) -> Release:
    """Nothing about the release."""
    return Release(ports, 0, Held((), (), (0, 0), (), problem=why), open=why)


def releases(ports: Ports, under: System, held: Held, limit: int) -> Release:
    """Every release from the states that reset leaves, none of them followed yet. `under` is the system under reset
    of the registers that the output depends on."""
    empty = Release(ports, limit, held, open=held.problem)
    if not held.states or ports.reset is None:
        return empty
    seen = seen_by(ports)
    many = len(held.states) > MOST_STATES
    try:
        before = {under.next(state): state for state in held.states}
        on_time = [_freed(seen, under, before[before[s]], 2, s, limit) for s in held.states]
        shadowed = _Shadowed.of(seen, limit)
        late = [late for each in on_time for late in shadowed.late(under, each)] if not many else []
    except _Unknown as why:
        return replace(empty, open=str(why))
    return replace(
        empty,
        levels=tuple(sorted({each.before for each in on_time})),
        on_time=tuple(on_time),
        late=tuple(late),
        flops=sum(register.width for register in shadowed.seen),
        open=f"{len(held.states)} states that reset leaves, too many to release flip-flops late from" * many,
    )


def some_releases(
    ports: Ports, under: System, held: Held, loops: Sequence[tuple[State, State]], limit: int
) -> Release:
    """Releases from a few of the states that reset leaves, where not all of these are known. Each is given with the
    state an input cycle before it on a loop under reset: it occurs however long reset is held."""
    empty = Release(ports, limit, held, open=held.problem)
    try:
        on_time = [_freed(seen_by(ports), under, start, 2, state, limit) for start, state in loops]
    except _Unknown:
        return empty
    return replace(empty, levels=tuple(sorted({each.before for each in on_time})), on_time=tuple(on_time))


def too_short(release: Release, under: System, start: State, cycles: int) -> Freed | None:
    """The release after so many input cycles of reset, begun in a state at rest; None where they suffice for that
    state, or what comes of it is not known. `under` is the system under reset."""
    if cycles > LONGEST_SHORT:
        return None
    state = start
    for _ in range(2 * cycles):
        state = under.next(state)
    if state in release.held.states:
        return None
    try:
        return _freed(seen_by(release.ports), under, start, 2 * cycles, state, release.limit)
    except _Unknown:
        return None


def _freed(ports: Ports, under: System, start: State, held: int, state: State, limit: int) -> Freed:
    moment = _moment(ports, under, state, ports.resetting)
    now = {**moment, **ports.running.moment(ports.design.inputs)}
    after = _settled(ports.design, moment, now, limit)[-1]
    before = _level(ports.output_value, moment)
    return Freed(start, held, state, before, (), _state(after, under.names))


def _moment(ports: Ports, system: System, state: State, inputs: Inputs) -> Moment:
    moment = {n: e.const(v, w) for (n, w), v in zip(system.variables, state, strict=True)}
    return moment | inputs.moment(ports.design.inputs)


def _state(moment: Moment, names: Sequence[str]) -> State:
    if e.variables([moment[name] for name in names]):
        raise _Unknown("what a release leads to hangs on a value that x stands for")
    return known(moment, names)


def _level(output: Expr, moment: Moment) -> int:
    (value,) = e.substitute([output], moment)
    if not value.is_const:
        raise _Unknown("the output hangs on a value that x stands for")
    return value.value


def _ticked(moment: Moment, clock: str) -> Moment:
    return {**moment, clock: e.bvnot(moment[clock])}


def _settled(design: Design, before: Moment, now: Moment, limit: int) -> list[Moment]:
    """The moments from `now` until all is at rest. Raises _Unknown where more than `limit` micro-steps are needed."""
    steps = unroll(design, before, now, limit + 1)
    if len(steps) == limit + 2:
        raise _Unknown("the registers do not settle when reset is released")
    return steps


# -- a flip-flop that is late ------------------------------------------------------------------------------


@dataclass(frozen=True, slots=True)
class _Shadowed:
    """The design with a shadow of every register that sees the reset. A shadow is what its register would be if reset
    were not yet released for it; the bits in the mask of a register are taken from there.

    whole   what stands for each such register: its own bits, and those of the shadow that the mask picks
    seen    these registers as they were"""

    ports: Ports
    design: Design
    whole: Mapping[str, Expr]
    seen: tuple[Register, ...]
    output: Expr
    limit: int

    @staticmethod
    def of(ports: Ports, limit: int) -> _Shadowed:
        if ports.reset is None:
            raise InternalError("a release without a reset")
        port, late = ports.reset.port, {ports.reset.port: e.var(LATE, 1)}
        seen = tuple(r for r in ports.design.registers if r.kind != "loop" and _sees(r, port))
        whole = {r.name: _whole(r) for r in seen}
        registers = [_with(r, r.name, whole) for r in ports.design.registers]
        registers += [_with(r, SHADOW + r.name, whole | late) for r in seen]
        inputs = {**ports.design.inputs, LATE: 1, **{MASK + r.name: r.width for r in seen}}
        design = replace(ports.design, registers=tuple(registers), inputs=inputs)
        (output,) = e.substitute([ports.output_value], whole)
        return _Shadowed(ports, design, whole, seen, output, limit)

    def late(self, system: System, freed: Freed) -> list[Freed]:
        """The releases beside one on time in which one flip-flop is an edge later, as far as it makes a difference
        that lasts beyond that edge or that the output shows."""
        watched = self._run(system, freed, None)
        on_time = self._outcome(system, watched)
        out = []
        for register in self.seen:
            apart = 0
            for moment in chain(*watched):
                own, shadow = e.evaluate([moment[register.name], moment[SHADOW + register.name]], {})
                apart |= own ^ shadow
            for bit in range(register.width):
                # A bit that its shadow never leaves would take the very same course.
                if apart >> bit & 1:
                    flop = Flop(register.name, bit, register.width)
                    outcome = self._outcome(system, self._run(system, freed, flop))
                    if outcome != on_time:
                        early, state = outcome
                        out.append(replace(freed, early=early, state=state, flop=flop))
        return out

    def _run(self, system: System, freed: Freed, flop: Flop | None) -> tuple[list[Moment], ...]:
        """The moments after the release, after the edge that follows, and after the release of the flip-flop."""
        ports, design = self.ports, self.design
        moment = _moment(ports, system, freed.under, ports.resetting)
        moment |= {SHADOW + r.name: moment[r.name] for r in self.seen}
        moment |= {MASK + r.name: e.const(0, r.width) for r in self.seen}
        if flop is not None:
            moment[MASK + flop.register] = e.const(1 << flop.bit, flop.width)
        active, running = ports.resetting, ports.running.moment(ports.design.inputs)
        port = ports.reset.port if ports.reset else ""
        moment[LATE] = e.const(dict(active.values)[port], 1)
        released = _settled(design, moment, moment | running, self.limit)
        edge = _settled(design, released[-1], _ticked(released[-1], ports.clock), self.limit)
        last = _settled(design, edge[-1], edge[-1] | {LATE: running[port]}, self.limit)
        return released, edge, last

    def _outcome(self, system: System, moments: tuple[list[Moment], ...]) -> tuple[tuple[int, ...], State]:
        """The output after the release and after the edge, and the state in the end."""
        released, edge, last = (steps[-1] for steps in moments)
        names = list(self.whole)
        values = e.substitute([self.whole[name] for name in names], last)
        state = _state({**last, **dict(zip(names, values, strict=True))}, system.names)
        return (_level(self.output, released), _level(self.output, edge)), state


def _sees(register: Register, port: str) -> bool:
    """Whether the reset is in the register's own clock, data, or set and clear."""
    used = [x for edge in register.edges for x in (edge.clock, edge.data)]
    used += [x for force in register.forces for x in (force.when, force.value)]
    return any(v.name == port for v in e.variables(used))


def _whole(register: Register) -> Expr:
    mask = e.var(MASK + register.name, register.width)
    own, shadow = e.var(register.name, register.width), e.var(SHADOW + register.name, register.width)
    return e.bvor(e.bvand(own, e.bvnot(mask)), e.bvand(shadow, mask))


def _with(register: Register, name: str, values: Mapping[str, Expr]) -> Register:
    """The register under a name, with expressions put in for some names."""

    def put(x: Expr) -> Expr:
        return e.substitute([x], values)[0]

    edges = tuple(Edge(put(edge.clock), put(edge.data)) for edge in register.edges)
    forces = tuple(replace(f, when=put(f.when), value=put(f.value)) for f in register.forces)
    return replace(register, name=name, edges=edges, forces=forces)


# -- what the output does ----------------------------------------------------------------------------------


def pulses(freed: Freed, rounds: int | None = None) -> Iterator[Pulse]:
    """The whole pulses and gaps of the output from the release on, over the run's lead-in and so many rounds of its
    loop; without a number, until all pulses of its wave have been seen. What the output is when the release comes is
    none of them: it began before."""
    if freed.orbit is None:
        return
    period = freed.wave.period or 0 if freed.wave else 0
    horizon = len(freed.early) + UNITS * (freed.orbit.lead_half_cycles + 2 * period + 1)
    around = rounds if rounds is not None else 3 if freed.wave else 0
    at = 0
    pending: Pulse | None = None
    for index, (level, length) in enumerate(_levels(freed, around)):
        if pending is not None:
            yield pending
        if rounds is None and at > horizon:
            return
        pending = Pulse(level, at, length) if index > 0 else None
        at += length


def _levels(freed: Freed, rounds: int) -> Iterator[Run]:
    """The output's runs in halves of a half-cycle; the first goes on from before the release."""

    def parts() -> Iterator[Run]:
        yield freed.before, 0
        for level in freed.early:
            yield level, 1
        if freed.orbit is not None:
            for index, (level, length) in enumerate(freed.orbit.runs(rounds)):
                # The run begins in the middle of a half-cycle.
                yield level, UNITS * length - (index == 0)

    return path.merged(parts())


def same_output(a: Freed, b: Freed) -> bool | None:
    """Whether the output is the same for ever, just before the releases included; None if that is not known."""
    if a.orbit is None or b.orbit is None or a.wave is None or b.wave is None:
        return None
    if a.wave != b.wave:
        return False
    lead = max(a.orbit.lead_half_cycles, b.orbit.lead_half_cycles)
    alike = lead + 2 * (a.wave.period or 0) + 2
    both = [islice(_within(each, alike), LONGEST_ROUND + 1) for each in (a, b)]
    count = 0
    for one, other in zip_longest(*both):
        if one != other:
            return False
        count += 1
    return None if count > LONGEST_ROUND else True


def differs(release: Release, freed: Freed) -> bool:
    """Whether the output is known to differ from that after some release on time at the same level of the clock."""
    return any(same_output(freed, each) is False for each in release.on_time if each.clock == freed.clock)


def _within(freed: Freed, half_cycles: int) -> Iterator[Run]:
    """The runs up to so many half-cycles after the release, the last one cut off there."""
    loop = freed.orbit.loop_half_cycles if freed.orbit else 1
    left = UNITS * half_cycles
    for level, length in _levels(freed, half_cycles // max(loop, 1) + 2):
        yield level, min(length, left)
        left -= length
        if left <= 0:
            return


def edge_after(units: int) -> int:
    """The clock edge after the release at which something comes that many halves of a half-cycle later; 0 for what
    comes with the release."""
    return (units + 1) // UNITS


# -- traces ------------------------------------------------------------------------------------------------


def trace_of(release: Release, freed: Freed, begins: int, ends: int, text: str) -> Trace | None:
    """The release as a trace that is broken between two clock edges after it; None for one that takes too long, or in
    which a flip-flop is late. Raises NotShown where it does not replay."""
    ports = release.ports
    if freed.flop is not None or freed.held + ends > LONGEST_TRACE:
        return None
    outputs = {ports.output: ports.output_value}
    registers = start_registers(release, freed)
    first = rest_of(ports.design, outputs, dict(ports.resetting.values), registers)
    more = max(ends + AFTERWARDS, SHORTEST)
    moves = [*(None for _ in range(freed.held)), dict(ports.running.values), *(None for _ in range(more))]
    rests = run(ports.design, ports.clock, outputs, first, moves, release.limit)
    cause = f"reset held for {freed.held} half-cycles, and {freed.cause.removeprefix('reset ')}"
    made = Trace(rests, freed.held + begins, freed.held + max(ends, begins + 1), text, cause)
    _check(release, freed, made)
    return made


def start_registers(release: Release, freed: Freed) -> dict[str, int]:
    """All registers and the clock at the start of a release's trace, at rest under reset; those that the output does
    not depend on are 0 there."""
    ports = release.ports
    values = dict(zip(release.held.names, freed.start, strict=True))
    names = [*(r.name for r in ports.design.registers), ports.clock]
    if len(values) == len(names):
        return values
    moment = {r.name: e.const(values.get(r.name, 0), r.width) for r in ports.design.registers}
    moment |= {ports.clock: e.const(values[ports.clock], 1)} | ports.resetting.moment(ports.design.inputs)
    after = _settled(ports.design, moment, moment, release.limit)[-1]
    return dict(zip(names, _state(after, names), strict=True))


def after_release(system: System, held: Held, freed: Freed, active: Inputs, limit: int) -> State | None:
    """The state of the whole system from which the run after a release goes on; None if it does not settle."""
    if freed.flop is None and freed.under in held.states:
        return released_from(system, held, freed.under, active, limit)
    return filled(system, held.names, freed.state, limit)


class NotShown(InternalError):
    """A run after a release that is not what the machine does."""


def _check(release: Release, freed: Freed, trace: Trace) -> None:
    """Raise NotShown where the trace is no run of the design, or another than the orbit that it is to show."""
    ports = release.ports
    wrong = faults(ports.design, ports.clock, {ports.output: ports.output_value}, trace, release.limit)
    # One rest for each half-cycle under reset, and the next one is after the release.
    seen = trace.rests[freed.held + 1 :]
    if tuple(seen[0].registers[name] for name in release.held.names) != freed.state:
        wrong.append("the release leads elsewhere")
    if freed.orbit is not None:
        levels = (level for level, length in freed.orbit.runs(1) for _ in range(length))
        shown = [rest.outputs[ports.output] for rest in seen]
        wrong += [f"{a} is shown for {b}" for a, b in zip(shown, levels, strict=False) if a != b]
    if wrong:
        raise NotShown(f"the trace of a release does not replay: {'; '.join(wrong[:3])}")
