"""A run of the machine whose inputs move: reset, a ratio, an enable.

An orbit (`rhythm.Orbit`) has its inputs held and goes on for ever; a trace is finite. A half-cycle begins with an
edge of the input clock. In its middle the other inputs may move, and the machine settles once more; so a half-cycle
has one rest or two, and an output that changes with the inputs makes a pulse shorter than a half-cycle.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

from prover import expr as e
from prover.design import Design
from prover.errors import InternalError
from prover.expr import Expr
from prover.system import Inputs, Moment, change_inputs, clock_edge


@dataclass(frozen=True, slots=True)
class Rest:
    """The machine at rest.

    half_cycle  half-cycles since the trace's start
    moved       True: after the inputs moved, in the middle of the half-cycle; False: after its edge, or the start
    inputs      values of the inputs other than the clock, by port
    registers   values of all registers and of the clock, by name
    outputs     values of the outputs that the trace is about, by name
    """

    half_cycle: int
    moved: bool
    inputs: Mapping[str, int]
    registers: Mapping[str, int]
    outputs: Mapping[str, int]


@dataclass(frozen=True, slots=True)
class Trace:
    """A finite run that breaks a claim.

    rests         in the order of time; the first is the start
    begins, ends  half-cycles between which the claim is broken (ends exclusive)
    text          what is seen there
    cause         how the start comes about
    on_the_way    it is broken within the last half-cycle, between the rests before and after its edge
    """

    rests: tuple[Rest, ...]
    begins: int
    ends: int
    text: str
    cause: str
    on_the_way: bool = False

    @property
    def half_cycles(self) -> int:
        """Half-cycles that the trace covers, the last one included."""
        return self.rests[-1].half_cycle + 1


def rest_of(
    design: Design, outputs: Mapping[str, Expr], inputs: Mapping[str, int], registers: Mapping[str, int]
) -> Rest:
    """The first rest of a trace, from values of the inputs and of all registers and the clock; choices are 0."""
    start = Rest(0, False, dict(inputs), dict(registers), {})
    moment = _moment(design, start)
    (clock,) = set(registers) - {r.name for r in design.registers}
    return _rest(design, clock, outputs, 0, False, inputs, moment)


def run(
    design: Design,
    clock: str,
    outputs: Mapping[str, Expr],
    first: Rest,
    moves: Sequence[Mapping[str, int] | None],
    limit: int,
) -> tuple[Rest, ...]:
    """The rests from `first` on: in each half-cycle the inputs move to `moves[half-cycle]` (None: they do not), then
    the next begins. `limit` is the number of micro-steps within which all settles; choices that x leaves are 0."""
    rests = [first]
    moment = _moment(design, first)
    inputs = dict(first.inputs)
    for half_cycle, move in enumerate(moves):
        if half_cycle > 0:
            moment = _values(clock_edge(design, clock, moment, limit))
            rests.append(_rest(design, clock, outputs, half_cycle, False, inputs, moment))
        if move is not None and any(inputs[name] != value for name, value in move.items()):
            inputs |= move
            moment = _values(change_inputs(design, clock, moment, Inputs.of(inputs), limit))
            rests.append(_rest(design, clock, outputs, half_cycle, True, inputs, moment))
    return tuple(rests)


def faults(design: Design, clock: str, outputs: Mapping[str, Expr], trace: Trace, limit: int) -> list[str]:
    """Where the trace is no run of the design, after its first rest; none if it replays."""
    moves: list[Mapping[str, int] | None] = [None] * trace.half_cycles
    for rest in trace.rests[1:]:
        if rest.moved:
            moves[rest.half_cycle] = rest.inputs
    again = run(design, clock, outputs, trace.rests[0], moves, limit)
    if len(again) != len(trace.rests):
        return [f"{len(again)} rests, not {len(trace.rests)}"]
    pairs = zip(again, trace.rests, strict=True)
    return [f"half-cycle {b.half_cycle}: {a} is not {b}" for a, b in pairs if a != b]


def _moment(design: Design, rest: Rest) -> Moment:
    widths = {r.name: r.width for r in design.registers} | dict(design.inputs)
    values = {**rest.inputs, **rest.registers}
    missing = [name for name in widths if name not in values]
    if missing:
        raise InternalError(f"a rest without {', '.join(missing)}")
    return {name: e.const(values[name], width) for name, width in widths.items()}


def _values(moment: Moment) -> Moment:
    """The same moment with choices at 0, so that all is constant."""
    zeros = {v.name: e.const(0, v.width) for v in e.variables(list(moment.values()))}
    return dict(zip(moment, e.substitute(list(moment.values()), zeros), strict=True)) if zeros else moment


def _rest(
    design: Design,
    clock: str,
    outputs: Mapping[str, Expr],
    half_cycle: int,
    moved: bool,
    inputs: Mapping[str, int],
    moment: Moment,
) -> Rest:
    names = [*(r.name for r in design.registers), clock]
    registers = dict(zip(names, e.evaluate([moment[name] for name in names], {}), strict=True))
    seen = _values(dict(zip(outputs, e.substitute(list(outputs.values()), moment), strict=True)))
    levels = dict(zip(outputs, e.evaluate([seen[name] for name in outputs], {}), strict=True))
    return Rest(half_cycle, moved, dict(inputs), registers, levels)
