"""Orders of arrival in a test bench: changes that come at one moment, brought to the divider one after another.

Without delays a simulator takes what happens at once in one order, and shows nothing of the others. So the bench
first lets the divider make a step from the start state and notes what its registers become. Then it puts the start
state back, holds the registers by force, and changes the clock and the bits that changed one at a time: each register
to what the divider itself made of it, so that a mended divider is shown no change that it does not make.

For a hazard on a clock, a set, a clear or a latch's enable two orders are tried, and the register in question, which
is not held, has to become the same. For a glitch the output may change once.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import pairwise, permutations

from prover import expr as e
from prover.arrival import Glitch, bit_name
from prover.design import Design, Gate, Register, components, ended
from prover.expr import Expr
from prover.findings import Finding, Report
from prover.hazard import gate, still
from prover.report.checks import HALF_CYCLE
from prover.report.dut import Dut, NoBench, Scene, came, word
from prover.settling import Race
from prover.system import Moment, clock_edge, micro_step

APART = 10
"""Units of time between two arrivals."""

MOST_MOVES = 6
"""Bits that change together, up to which all their orders are tried."""

MOST_REACTIONS = 64

ABOUT = (
    "From the start state it lets the divider make one step and notes what the registers become. Then it puts the",
    "start state back, holds them by force, and lets the same changes arrive one after another, in an order that",
    "gates of some delays can bring about.",
)

Move = tuple[str, int]
"""A register and one of its bits; the clock has bit 0."""


def scene(report: Report, finding: Finding, dut: Dut) -> Scene:
    """The orders that refute. Raises NoBench where none is known that can be forced."""
    if finding.glitch is not None:
        return _glitch(report, finding, dut)
    pulses = [race for race in report.rhythm.settling.races if race.kind == "pulse"]
    why = NoBench("it has no run that could be replayed")
    # One pulse may be a hazard for several registers; at the one that is named it need not show.
    for race in sorted(pulses, key=lambda race: race.text not in finding.says):
        try:
            return _pulse(report, race, dut)
        except NoBench as fault:
            why = fault
    raise why


# -- hazards -----------------------------------------------------------------------------------------------


def _pulse(report: Report, race: Race, dut: Dut) -> Scene:
    """Two orders after which the register is not the same."""
    names = [*(r.name for r in report.ports.design.registers), report.ports.clock]
    start = dict(zip(names, race.state, strict=True))
    register = next(r for r in report.ports.design.registers if r.name == race.register)
    path = dut.path(register.name)
    shared = [r.name for r in report.ports.design.registers if dut.path(r.name) == path]
    if len(shared) > 1:
        raise NoBench(f"{register.name} is a part of a vector, of which parts can't be held by themselves")
    muted, first, second, ends = _found_orders(report, register, start)
    told = [", ".join(dict.fromkeys(_named(report, move) for move in order)) for order in (first, second)]
    width = register.width
    return Scene(
        start="before a clock edge",
        about=ABOUT,
        level=start[report.ports.clock],
        declarations=[
            f"reg [{dut.bits - 1}:0] settled;",
            f"reg [{width - 1}:0] first, other;",
            dut.registers,
        ],
        code=[
            "initial begin",
            *(f"  {line}" for line in _step(dut, start, muted)),
            *(f"  {line}" for line in _arrivals(report, dut, start, first, free=path)),
            f"  first = {path};",
            *(f"  {line}" for line in _arrivals(report, dut, start, second, free=path)),
            f"  other = {path};",
            "  if (first !== other) begin",
            *came(
                f"{_percent(register.name)} becomes %0d where {_percent(told[0])} arrive in this order, "
                f"and %0d where {_percent(told[1])} do",
                "first, other",
                f"first == {word(width, ends[0])} && other == {word(width, ends[1])}",
                4,
            ),
            "  end",
            "  verdict;",
            "end",
        ],
        passed=(f"{_percent(register.name)} becomes %0d either way", "first"),
    )


def _percent(name: str) -> str:
    return name.replace("\\", "\\\\").replace('"', '\\"').replace("%", "%%")


def _named(report: Report, move: Move) -> str:
    return bit_name(report.ports.design, *move)


@dataclass(frozen=True, slots=True)
class _Muted:
    """A net that is held inactive while the divider's own step is noted, because its pulse would change that."""

    path: str
    inactive: int
    design: Design


def _nets(report: Report, register: Register) -> Iterator[_Muted]:
    """The clock, sets and clears of the register that have a name in the sources."""
    design = report.ports.design
    for net in [edge.clock for edge in register.edges] + [force.when for force in register.forces]:
        for signal in design.signals.values():
            if signal.value in (net, e.bvnot(net)) and signal.value.op != "var":
                registers = tuple(
                    replace(
                        each,
                        edges=tuple(edge for edge in each.edges if edge.clock is not net),
                        forces=tuple(force for force in each.forces if force.when is not net),
                    )
                    for each in design.registers
                )
                quiet = replace(design, registers=registers)
                yield _Muted(f"dut.{ended(signal.name)}", int(signal.value is not net), quiet)


def _found_orders(
    report: Report, register: Register, start: Mapping[str, int]
) -> tuple[_Muted | None, Sequence[Move], Sequence[Move], tuple[int, int]]:
    """Two orders after which the register is not the same, of what changes in the divider's own step, or in its step
    if one of the register's nets is not heeded."""
    for muted in (None, *_nets(report, register)):
        found = _two_orders(report, register, start, muted.design if muted else report.ports.design)
        if found is not None:
            return muted, *found
    raise NoBench("no order of the changes that last to the end of a step shows it")


def _two_orders(
    report: Report, register: Register, start: Mapping[str, int], design: Design
) -> tuple[Sequence[Move], Sequence[Move], tuple[int, int]] | None:
    """Two orders of the bits that change in a step of the design and reach the register, after which it is not the
    same, and what it is after each; None if there are none."""
    ports = report.ports
    moment = _moment(report, start)
    settled = clock_edge(design, ports.clock, moment, report.rhythm.settling.depth or 1)
    after = {name: _value(settled[name]) for name in start}
    nets = [x for edge in register.edges for x in (edge.clock, edge.data)]
    nets += [x for force in register.forces for x in (force.when, force.value)]
    read = {v.name: v.width for v in e.variables(nets)} | {ports.clock: 1}
    moves = [
        (name, bit)
        for name, width in read.items()
        if name in after and name != register.name
        for bit in range(width)
        if (start[name] ^ after[name]) >> bit & 1
    ]
    if len(moves) > MOST_MOVES:
        raise NoBench(f"{len(moves)} bits change together, too many to try every order")
    alone = replace(ports.design, registers=(register,))
    ends: dict[int, Sequence[Move]] = {}
    # What a clock edge launches comes after it, if that is enough to show it.
    edge = [move for move in moves if move[0] == ports.clock]
    launched = [(*edge, *order) for order in permutations(move for move in moves if move not in edge)]
    for order in (*launched, *permutations(moves)):
        ends.setdefault(_becomes(alone, register, moment, order), order)
        if len(ends) == 2:
            (one, first), (two, second) = ends.items()
            return first, second, (one, two)
    return None


def _moment(report: Report, start: Mapping[str, int]) -> Moment:
    widths = {r.name: r.width for r in report.ports.design.registers} | {report.ports.clock: 1}
    moment = {name: e.const(start.get(name, 0), width) for name, width in widths.items()}
    return moment | report.ports.running.moment(report.ports.design.inputs)


def _becomes(alone: Design, register: Register, moment: Moment, order: Sequence[Move]) -> int:
    """What the register is once the bits have changed in this order, all other registers held."""
    for name, bit in order:
        before = moment
        now = {**moment, name: e.bvxor(moment[name], e.const(1 << bit, moment[name].width))}
        for _ in range(MOST_REACTIONS):
            later = micro_step(alone, before, now)
            if later[register.name] is now[register.name]:
                break
            before, now = now, later
        else:
            raise NoBench("the register does not settle when one bit changes")
        moment = now
    return _value(moment[register.name])


def _value(x: Expr) -> int:
    """A value; choices that x leaves are 0."""
    (value,) = e.evaluate([x], {v.name: 0 for v in e.variables([x])})
    return value


# -- glitches ----------------------------------------------------------------------------------------------


def _glitch(report: Report, finding: Finding, dut: Dut) -> Scene:
    """One order in which the output changes more than once."""
    glitch = finding.glitch
    assert glitch is not None
    start, names = dict(glitch.state), [arrival.name for arrival in glitch.arrivals]
    arrivals = _by_bits(report, glitch) if glitch.kind == "function" else _by_gates(report, glitch)
    levels = [glitch.level, *(arrival.level for arrival in arrivals)]
    changes = sum(a != b for a, b in pairwise(levels))
    if changes < 2:
        raise NoBench("what the last gate sees of it can't be brought about from outside")
    return Scene(
        start="before a clock edge",
        about=ABOUT,
        level=start[report.ports.clock],
        declarations=[
            f"reg [{dut.bits - 1}:0] settled;",
            "reg out, last;",
            "integer changes;",
            dut.registers,
            dut.shown,
        ],
        code=[
            "task observe;",
            "  begin",
            "    out = shown;",
            "    if (out !== last) changes = changes + 1;",
            "    last = out;",
            "  end",
            "endtask",
            "",
            "initial begin",
            *(f"  {line}" for line in _step(dut, start)),
            *(f"  {line}" for line in _arrivals(report, dut, start, arrivals, observed=True)),
            "  if (changes > 1) begin",
            *came(
                f"%0d changes of the output where {_percent(', '.join(names))} arrive in this order",
                "changes",
                f"changes == {changes}",
                4,
            ),
            "  end",
            "  verdict;",
            "end",
        ],
        passed=("%0d change of the output at most", "1"),
    )


@dataclass(frozen=True, slots=True)
class _Arrival:
    """Something that a bench lets arrive: a bit that changes, or none, values of nets, and the output then."""

    move: Move | None
    nets: Mapping[str, int]
    level: int


def _bits(report: Report) -> dict[str, Move]:
    """The bits of registers, and the clock, by the names that arrivals have."""
    design = report.ports.design
    bits = {bit_name(design, r.name, bit): (r.name, bit) for r in design.registers for bit in range(r.width)}
    return bits | {report.ports.clock: (report.ports.clock, 0)}


def _by_bits(report: Report, glitch: Glitch) -> list[_Arrival]:
    bits, names = _bits(report), [arrival.name for arrival in glitch.arrivals]
    if len(set(names)) < len(names) or not set(names) <= set(bits):
        raise NoBench("something changes twice in it, and a bench notes what lasts to the end of a step")
    return [_Arrival(bits[arrival.name], {}, arrival.level) for arrival in glitch.arrivals]


def _by_gates(report: Report, glitch: Glitch) -> list[_Arrival]:
    """The same where a change takes its own time to each gate: what every gate but the last drives is forced, and
    bits arrive only where that one reads them."""
    design, bits = report.ports.design, _bits(report)
    written = _written(report)
    last = written.name if written.op == "var" and written.name in design.gates else ""
    reader = f"{design.gates[last].kind} {last}" if last else ""
    values: dict[str, int] = dict(report.ports.running.values) | dict(glitch.state)
    out = []
    for arrival in glitch.arrivals:
        name, _, at = arrival.name.partition(" at ")
        nets = {net: value for net, value in arrival.seen.items() if net in design.gates and net != last}
        move = bits.get(name) if at == reader else None
        if move is not None:
            values[move[0]] ^= 1 << move[1]
        level = _driven(design.gates[last] if last else written, values | nets)
        out.append(_Arrival(move, nets, level))
    return out


def _written(report: Report) -> Expr:
    """The output over the nets of gates."""
    name = report.ports.output
    signal = report.ports.design.signals.get(name)
    if signal is None:
        raise NoBench("the output is a bit of a vector made by gates")
    return signal.written if signal.written is not None else signal.value


def _driven(source: Gate | Expr, values: Mapping[str, int]) -> int:
    """What a gate or an expression makes of these values."""
    if not isinstance(source, Gate):
        return e.evaluate([source], values)[0]
    pins = [still(e.const(value, 1)) for value in e.evaluate(list(source.pins), values)]
    return _value(gate(source.kind, pins).first)


# -- what both do ------------------------------------------------------------------------------------------


def _step(dut: Dut, start: Mapping[str, int], muted: _Muted | None = None) -> Iterator[str]:
    """The divider's own step from the start state."""
    yield "// The start state: forced so that nothing else reacts, then let go."
    yield from dut.set(start)
    if muted is not None:
        yield "// Inactive for this step: whether its pulse is seen is what is asked."
        yield f"force {muted.path} = 1'b{muted.inactive};"
    yield f"#{HALF_CYCLE} {dut.clock} = ~{dut.clock};"
    yield f"#{HALF_CYCLE} settled = registers;"
    if muted is not None:
        yield f"release {muted.path};"


def _arrivals(
    report: Report,
    dut: Dut,
    start: Mapping[str, int],
    order: Sequence[Move] | Sequence[_Arrival],
    free: str = "",
    observed: bool = False,
) -> Iterator[str]:
    """The start state put back and held, and the changes in their order; the register at `free` is let go."""
    if any(components(signal.name)[-1][1] for signal in dut.wholes.values()):
        raise NoBench("words of memories can't be held")
    clock = report.ports.clock
    state = dut.state(start)
    yield f"{dut.clock} = 1'b{start[clock]};"
    for path, (width, value) in state.items():
        yield f"force {path} = {word(width, value)};"
    yield f"#{HALF_CYCLE};"
    if free:
        yield f"release {free};"
    if observed:
        yield "last = shown;"
        yield "changes = 0;"
    places = _places(dut)
    done: dict[str, int] = {}
    nets: dict[str, int] = {}
    for each in order:
        arrival = each if isinstance(each, _Arrival) else _Arrival(each, {}, 0)
        yield f"#{APART};"
        for net, level in arrival.nets.items():
            if nets.get(net) != level:
                yield f"force dut.{ended(net)} = 1'b{level};"
        nets |= arrival.nets
        if arrival.move is not None and arrival.move[0] == clock:
            yield f"{dut.clock} = ~{dut.clock};"
        elif arrival.move is not None:
            name, bit = arrival.move
            path = dut.path(name)
            width, value = state[path]
            done[path] = done.get(path, 0) | _mask(dut, path, name, bit)
            mask, low = word(width, done[path]), places[path]
            arrived = f"settled[{low + width - 1}:{low}] & {mask}"
            yield f"force {path} = {arrived} | {word(width, value)} & ~{mask};"
        if observed:
            yield f"#{APART} observe;"
    yield f"#{HALF_CYCLE};"


def _mask(dut: Dut, path: str, name: str, bit: int) -> int:
    """Where a register's bit is in the declared name that it is a part of."""
    none, one = dut.state({}), dut.state({name: 1 << bit})
    return none[path][1] ^ one[path][1]


def _places(dut: Dut) -> dict[str, int]:
    """The lowest bit of each declared name in all registers together, where the first one is uppermost."""
    low, out = 0, {}
    for path, signal in reversed(dut.wholes.items()):
        out[path] = low
        low += signal.value.width
    return out
