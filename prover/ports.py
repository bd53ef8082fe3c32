"""Which port is the clock, which the reset, which the output: recognised from use.

The clock is the input that clocks registers; the reset one that forces registers, or one of whose values makes
registers' next values constant; the output what is driven out. Names only break ties. A choice that isn't plain
is an error that lists the candidates, and an input that is left over is an error that names --hold.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Literal

from prover import expr as e
from prover.design import Design, Edge, Signal, element
from prover.errors import UserError, Where
from prover.expr import Expr
from prover.solve import constant
from prover.spec import Spec
from prover.system import Inputs

CLOCK = re.compile(r"(?i)cl(oc)?k|^ck|ck$|cp$")
RESET = re.compile(r"(?i)re?se?t|clr|clear")
"""Names that break ties."""


@dataclass(frozen=True, slots=True)
class Reset:
    """The reset port, its active level, and whether it acts at once or with the clock."""

    port: str
    active: int
    kind: Literal["asynchronous", "synchronous"]


@dataclass(frozen=True, slots=True)
class Ports:
    """The roles of a design's ports, and the values at which the other inputs are held.

    `output_written` is the output over the nets that gates drive (see Design), `output_where` where it is driven.
    `free` are inputs that the design depends on and that are neither: only `recognise_open` leaves any."""

    design: Design
    clock: str
    reset: Reset | None
    output: str
    output_value: Expr
    holds: dict[str, int]
    output_written: Expr
    output_where: Where
    free: tuple[str, ...] = ()

    @property
    def running(self) -> Inputs:
        """The inputs with reset inactive."""
        return self._inputs(released=True)

    @property
    def resetting(self) -> Inputs:
        """The inputs with reset active."""
        return self._inputs(released=False)

    def _inputs(self, released: bool) -> Inputs:
        values = dict(self.holds)
        if self.reset:
            values[self.reset.port] = 1 - self.reset.active if released else self.reset.active
        return Inputs.of(values)


def recognise(design: Design, spec: Spec) -> Ports:
    """The ports' roles, from the options where they name them and from use otherwise.

    Raises UserError where a name is wrong, a choice isn't plain, or an input is left over.
    """
    ports = recognise_open(design, spec)
    for name in ports.free:
        raise UserError(
            f"input {name} is neither clock, reset nor held",
            _where(design, name),
            hint=_what_it_may_be(name),
        )
    return ports


def _what_it_may_be(name: str) -> str:
    if RESET.search(name):
        return (
            f"name it with --reset {name}=0 or --reset {name}=1, the level at which it acts, if it is the reset; "
            f"else give the value it has while the divider runs, such as --hold {name}=0"
        )
    return f"give the value it has while the divider runs, such as --hold {name}=1"


def recognise_open(design: Design, spec: Spec, moving: Collection[str] = ()) -> Ports:
    """The same, with inputs left over in `free` instead of an error. Those that are `moving` are no reset."""
    holds = _holds(design, spec)
    clock = _clock(design, spec, holds)
    design = _with_holds(design, holds)
    reset = _reset(design, spec, clock, holds | dict.fromkeys(moving, 0))
    output, signal, place = _output(design, spec)
    value, written = _bit(signal.value, place), _bit(signal.written or signal.value, place)
    used = _used_inputs(design, value)
    taken = {clock, *holds} | ({reset.port} if reset else set())
    left = [name for name in design.inputs if name not in taken]
    # An input that nothing depends on may have any value.
    holds |= {name: 0 for name in left if name not in used}
    free = tuple(name for name in left if name in used)
    return Ports(design, clock, reset, output, value, holds, written, signal.driven or signal.where, free)


def with_holds(ports: Ports, values: Mapping[str, int]) -> Ports:
    """The ports with free inputs held at these values."""
    widths = ports.design.inputs
    constants = {name: e.const(value, widths[name]) for name, value in values.items()}
    return replace(
        ports,
        design=_with_holds(ports.design, values),
        output_value=e.substitute([ports.output_value], constants)[0],
        output_written=e.substitute([ports.output_written], constants)[0],
        holds=ports.holds | dict(values),
        free=tuple(name for name in ports.free if name not in values),
    )


def _with_holds(design: Design, holds: Mapping[str, int]) -> Design:
    """The design with the held inputs' values put in: what is held takes no part in recognition."""
    if not holds:
        return design
    values = {name: e.const(value, design.inputs[name]) for name, value in holds.items()}

    def held(x: Expr) -> Expr:
        return e.substitute([x], values)[0]

    def perhaps(x: Expr | None) -> Expr | None:
        return None if x is None else held(x)

    registers = tuple(
        replace(
            register,
            edges=tuple(Edge(held(edge.clock), held(edge.data)) for edge in register.edges),
            forces=tuple(
                replace(f, when=held(f.when), value=held(f.value), written=perhaps(f.written))
                for f in register.forces
            ),
        )
        for register in design.registers
    )
    signals = {
        name: replace(signal, value=held(signal.value), written=perhaps(signal.written))
        for name, signal in design.signals.items()
    }
    gates = {
        net: replace(gate, pins=tuple(held(pin) for pin in gate.pins)) for net, gate in design.gates.items()
    }
    return replace(design, registers=registers, signals=signals, gates=gates)


def _where(design: Design, name: str) -> Where | None:
    signal = design.signals.get(name)
    return signal.where if signal else None


def _top(design: Design) -> Where | None:
    """Where the top module declares its first name."""
    return next((signal.where for signal in design.signals.values()), None)


def _known_input(design: Design, name: str, option: str) -> str:
    if name not in design.inputs:
        raise UserError(
            f"{option} {name}: {design.top} has no such input",
            hint=f"its inputs are {', '.join(design.inputs) or 'none'}",
        )
    return name


def _holds(design: Design, spec: Spec) -> dict[str, int]:
    holds: dict[str, int] = {}
    for name, value in spec.holds.items():
        _known_input(design, name, "--hold")
        width = design.inputs[name]
        if not -(1 << (width - 1)) <= value < 1 << width:
            raise UserError(
                f"--hold {name}={value}: the port has {width} bit{'s' * (width > 1)}",
                hint=f"give a value from 0 to {(1 << width) - 1}",
            )
        holds[name] = value % (1 << width)
    return holds


def _used_inputs(design: Design, output: Expr) -> set[str]:
    expressions = [x for r in design.registers for edge in r.edges for x in (edge.clock, edge.data)]
    expressions += [x for r in design.registers for f in r.forces for x in (f.when, f.value)]
    return {v.name for v in e.variables([*expressions, output])}


def _clock_inputs(design: Design, holds: Mapping[str, int]) -> dict[str, int]:
    """Inputs that clock registers, with a count of the registers that each clocks all alone."""
    found: dict[str, int] = {}
    for register in design.registers:
        for edge in register.edges:
            inputs = [v for v in e.variables([edge.clock]) if v.name in design.inputs and v.name not in holds]
            for v in inputs:
                alone = len(e.variables([edge.clock])) == 1
                found[v.name] = found.get(v.name, 0) + (1 if alone else 0)
    if not found:
        # A divider of latches has no edge; what opens its latches and does not clear them is its clock.
        clears = _held_by_level(design, "", holds)
        for register in design.registers:
            if register.kind == "latch":
                for v in e.variables([force.when for force in register.forces]):
                    if v.name in design.inputs and v.name not in holds and v.name not in clears:
                        found[v.name] = found.get(v.name, 0) + 1
    if not found:
        # Nor has one of gates that hold their state in loops.
        loops = [force for r in design.registers if r.kind == "loop" for force in r.forces]
        inputs = e.variables([x for force in loops for x in (force.when, force.value)])
        found = {v.name: 0 for v in inputs if v.name in design.inputs and v.name not in holds}
    return {name: count for name, count in found.items() if design.inputs[name] == 1}


def _clock(design: Design, spec: Spec, holds: Mapping[str, int]) -> str:
    if spec.clock is not None:
        name = _known_input(design, spec.clock, "--clock")
        if design.inputs[name] != 1:
            raise UserError(
                f"--clock {name}: the port has {design.inputs[name]} bits", hint="name an input of one bit"
            )
        if name in holds:
            raise UserError(f"{name} is named both as clock and as held", hint="leave one of the two out")
        return name
    candidates = _clock_inputs(design, holds)
    if not candidates:
        held = [name for name in _clock_inputs(design, {}) if name in holds]
        if held:
            raise UserError(
                f"--hold {held[0]}: no other input of {design.top} clocks a register",
                _where(design, held[0]),
                hint="the clock can't be held",
            )
        hint = "a divider has flip-flops that an input clocks; name the clock with --clock PORT"
        raise UserError(f"no input of {design.top} clocks a register", _top(design), hint=hint)
    best = max(candidates.values())
    names = [name for name, count in candidates.items() if count == best]
    if len(names) > 1:
        named = [n for n in names if CLOCK.search(n)]
        names = named if len(named) == 1 else names
    if len(names) > 1:
        raise UserError(
            f"several inputs could be the clock: {', '.join(names)}",
            _where(design, names[0]),
            hint="name it with --clock PORT, and hold the others with --hold PORT=VALUE",
        )
    return names[0]


def _reset(design: Design, spec: Spec, clock: str, holds: Mapping[str, int]) -> Reset | None:
    asynchronous = _asynchronous(design, clock, holds)
    synchronous = _synchronous(design, clock, holds)
    if not asynchronous and not synchronous:
        asynchronous = _held_by_level(design, clock, holds)
    if spec.reset is not None:
        name, equals, level = spec.reset.partition("=")
        _known_input(design, name, "--reset")
        if design.inputs[name] != 1:
            raise UserError(
                f"--reset {name}: the port has {design.inputs[name]} bits", hint="name an input of one bit"
            )
        if equals and level not in ("0", "1"):
            raise UserError(
                f"--reset {spec.reset}: the active level is 0 or 1", hint=f"such as --reset {name}=0"
            )
        kind: Literal["asynchronous", "synchronous"]
        kind = "asynchronous" if name in asynchronous else "synchronous"
        levels = asynchronous.get(name) or synchronous.get(name) or set()
        if not equals and len(levels) != 1:
            raise UserError(
                f"--reset {name}: the code does not tell at which level it is active",
                _where(design, name),
                hint=f"write --reset {name}=1 or --reset {name}=0",
            )
        return Reset(name, int(level) if equals else min(levels), kind)
    for found, kind in ((asynchronous, "asynchronous"), (synchronous, "synchronous")):
        plain = {name: levels for name, levels in found.items() if len(levels) == 1}
        names = list(found)
        if len(names) > 1:
            named = [n for n in names if n in plain and RESET.search(n)]
            names = named if len(named) == 1 else names
        if len(names) > 1 or (names and names[0] not in plain):
            raise UserError(
                f"several inputs could be the reset: {', '.join(names)}"
                if len(names) > 1
                else f"input {names[0]} sets registers at either level",
                _where(design, names[0]),
                hint="name it with --reset PORT=LEVEL, and hold the others with --hold PORT=VALUE",
            )
        if names:
            return Reset(
                names[0], min(plain[names[0]]), "asynchronous" if kind == "asynchronous" else "synchronous"
            )
    return None


def _free_inputs(
    design: Design, expressions: Sequence[Expr], clock: str, holds: Mapping[str, int]
) -> list[str]:
    names = [v.name for v in e.variables(expressions) if v.name in design.inputs and v.width == 1]
    return [name for name in names if name != clock and name not in holds]


def _asynchronous(
    design: Design, clock: str, holds: Mapping[str, int], kinds: Collection[str] = ("flip-flop",)
) -> dict[str, set[int]]:
    """Inputs of which one level forces a register of these kinds to a constant, with those levels."""
    found: dict[str, set[int]] = {}
    for register in design.registers:
        if register.kind not in kinds:
            continue
        for force in register.forces:
            # A loop of gates is open all the time; what clears it is part of what it takes on.
            read = [force.when, force.value] if register.kind == "loop" else [force.when]
            for name in _free_inputs(design, read, clock, holds):
                for level in (0, 1):
                    when, value = e.substitute([force.when, force.value], {name: e.const(level, 1)})
                    if constant(when) == 1 and constant(value) is not None:
                        found.setdefault(name, set()).add(level)
    return found


def _held_by_level(design: Design, clock: str, holds: Mapping[str, int]) -> dict[str, set[int]]:
    """The same of latches and loops, but for inputs that set them at either level."""
    found = _asynchronous(design, clock, holds, ("latch", "loop"))
    return {name: levels for name, levels in found.items() if len(levels) == 1}


def _synchronous(design: Design, clock: str, holds: Mapping[str, int]) -> dict[str, set[int]]:
    """Inputs of which one level makes a register's next value constant, with those levels."""
    found: dict[str, set[int]] = {}
    for register in design.registers:
        for edge in register.edges:
            names = _free_inputs(design, [edge.data], clock, holds)
            if not names or constant(edge.data) is not None:
                continue
            for name in names:
                for level in (0, 1):
                    (data,) = e.substitute([edge.data], {name: e.const(level, 1)})
                    if constant(data) is not None:
                        found.setdefault(name, set()).add(level)
    return found


def _bit(word: Expr, place: int | None) -> Expr:
    return word if place is None else e.extract(word, place, place)


def _output(design: Design, spec: Spec) -> tuple[str, Signal, int | None]:
    """The output's name, its signal, and which bit of it is meant where it has several."""
    if spec.output is not None:
        return spec.output, *_named_output(design, spec.output)
    scalar = [n for n in design.outputs if design.signals[n].value.width == 1]
    if len(scalar) == 1:
        return scalar[0], design.signals[scalar[0]], None
    listed = scalar or [element(n, _bounds(design, n)) for n in design.outputs]
    if not listed:
        hint = "name a net with --output NAME"
        raise UserError(f"{design.top} drives no output", _top(design), hint=hint)
    raise UserError(
        f"several outputs could be the divided clock: {', '.join(listed)}",
        _where(design, design.outputs[0]),
        hint="name one with --output PORT, or a bit with --output 'PORT[3]'",
    )


def _bounds(design: Design, name: str) -> str:
    signal = design.signals[name]
    return f"{signal.msb}:{signal.lsb}"


def _named_output(design: Design, text: str) -> tuple[Signal, int | None]:
    name, bracket, index = text.rpartition("[")
    name = name.rstrip(" ") if bracket else text
    signal = design.signals.get(text) or design.signals.get(name)
    if signal is None:
        raise UserError(
            f"--output {text}: {design.top} has no such port or net",
            hint=f"its outputs are {', '.join(design.outputs) or 'none'}",
        )
    if text in design.signals or not bracket:
        if signal.value.width != 1:
            raise UserError(
                f"--output {text}: {signal.value.width} bits wide",
                signal.where,
                hint=f"name one bit, such as --output '{element(signal.name, signal.lsb)}'",
            )
        return signal, None
    number = re.fullmatch(r"(-?\d+)\]", index)
    place = (
        None
        if not number
        else int(number[1]) - signal.lsb
        if signal.msb >= signal.lsb
        else signal.lsb - int(number[1])
    )
    if place is None or not 0 <= place < signal.value.width:
        raise UserError(
            f"--output {text}: the bits are {signal.msb} to {signal.lsb}",
            signal.where,
            hint=f"name one of them, such as --output '{element(signal.name, signal.lsb)}'",
        )
    return signal, place
