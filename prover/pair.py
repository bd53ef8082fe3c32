"""Two dividers to be compared: how each is read, which input of one is which of the other, and both as one design.

Side by side they are one design on one clock: the registers of each under `old.` and `new.`, the reset and the inputs
that both have in common. What moves for one moves for the other in the same moment.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Literal

from prover import expr as e
from prover.design import Design, Edge, Force, Register, Signal
from prover.errors import UserError, Where
from prover.expr import Expr
from prover.ports import Ports, Reset, recognise_open, with_holds
from prover.spec import Spec

SIDES = ("old", "new")


@dataclass(frozen=True)
class Pairing:
    """What is asked of two dividers.

    old, new   how each is read: module, ports, parameters, holds, defines and include folders of a Spec
    holds      inputs that are held in whichever divider has them, by their names in the old one
    maps       input of the old divider to the one of the new that is the same; without: the one of the same name
    moving     inputs, by their names in the old divider, that may change between any two edges; all others are held
    start      where the comparison begins; None: after reset if both have one, else at the initial values
    lag        half-cycles by which the new output is late (negative: early); None: whatever number fits
    settled    from every pair of power-up states, once both have settled, instead of from a start
    effort     seconds
    """

    old: Spec = field(default_factory=Spec)
    new: Spec = field(default_factory=Spec)
    holds: Mapping[str, int] = field(default_factory=dict)
    maps: Mapping[str, str] = field(default_factory=dict)
    moving: tuple[str, ...] = ()
    start: Literal["reset", "initial"] | None = None
    lag: int | None = 0
    settled: bool = False
    effort: float = 60.0

    def __post_init__(self) -> None:
        if self.settled and self.moving:
            raise UserError("dividers never settle while inputs move", hint="leave out --moving or --after")
        if self.settled and self.start is not None:
            raise UserError(
                "--after any begins at every pair of power-up states", hint="leave out --start or --after"
            )
        if self.settled and self.lag:
            raise UserError(
                "dividers that power up apart have no certain lag", hint="give --lag any, or no --lag"
            )


@dataclass(frozen=True, slots=True)
class Shared:
    """An input that both dividers share, or that one has and the other does not depend on.

    name      what it is called: its name in the old divider if that has it
    old, new  its names in the two; None where that one does not depend on it
    """

    name: str
    old: str | None
    new: str | None
    width: int
    moving: bool


@dataclass(frozen=True, slots=True)
class Pair:
    """Two dividers with the roles of their ports, and the inputs that are neither held nor clock nor reset."""

    old: Ports
    new: Ports
    inputs: tuple[Shared, ...]
    scope: Literal["reset", "initial", "any"]

    def held_at(self, values: Mapping[str, int]) -> tuple[Ports, Ports]:
        """Both dividers with the shared inputs held at values by name."""
        old = {x.old: values[x.name] for x in self.inputs if x.old is not None}
        new = {x.new: values[x.name] for x in self.inputs if x.new is not None}
        return with_holds(self.old, old), with_holds(self.new, new)

    @property
    def input_bits(self) -> int:
        """Bits of all shared inputs together."""
        return sum(each.width for each in self.inputs)


def read_pair(old: Sequence[str | Path], new: Sequence[str | Path], pairing: Pairing) -> Pair:
    """Both dividers read and matched. Raises UserError where that can't be done as asked."""
    from prover.verilog import read_design

    designs = []
    for files, spec in ((old, pairing.old), (new, pairing.new)):
        designs.append(
            read_design(
                files,
                module=spec.module,
                defines=spec.defines,
                include=[Path(folder) for folder in spec.include],
                parameters=spec.parameters,
            )
        )
    return match(designs[0], designs[1], pairing)


def match(old: Design, new: Design, pairing: Pairing) -> Pair:
    """The pair of two designs. Raises UserError for an input of one that the other has not, unless it is held."""
    back = _backwards(old, new, pairing.maps)
    pairing = _with_holds(old, new, pairing)
    for name in pairing.moving:
        if name not in old.inputs and name not in new.inputs:
            raise UserError(
                f"--moving {name}: there is no such input", hint=f"the inputs are {_listed(old, new)}"
            )
    sides = (
        recognise_open(old, pairing.old, pairing.moving),
        recognise_open(new, pairing.new, [pairing.maps.get(name, name) for name in pairing.moving]),
    )
    inputs = tuple(_inputs(*sides, pairing, back))
    for name in pairing.moving:
        if name not in {each.name for each in inputs}:
            raise UserError(
                f"--moving {name}: it is held, clock or reset, or nothing depends on it",
                hint="name an input that is free to move",
            )
    return Pair(*sides, inputs, _scope(*sides, pairing))


def _with_holds(old: Design, new: Design, pairing: Pairing) -> Pairing:
    """The holds of both given to each. Raises UserError for one that neither has."""
    ours = {pairing.maps.get(name, name): value for name, value in pairing.holds.items()}
    for name in pairing.holds:
        if name not in old.inputs and pairing.maps.get(name, name) not in new.inputs:
            raise UserError(
                f"--hold {name}: there is no such input", hint=f"the inputs are {_listed(old, new)}"
            )
    of_old = {name: value for name, value in pairing.holds.items() if name in old.inputs}
    of_new = {name: value for name, value in ours.items() if name in new.inputs}
    return replace(
        pairing,
        old=replace(pairing.old, holds=of_old | dict(pairing.old.holds)),
        new=replace(pairing.new, holds=of_new | dict(pairing.new.holds)),
        holds={},
    )


def _listed(*designs: Design) -> str:
    return ", ".join(dict.fromkeys(name for design in designs for name in design.inputs)) or "none"


def _backwards(old: Design, new: Design, maps: Mapping[str, str]) -> dict[str, str]:
    """The maps from new to old. Raises UserError where they name no inputs, or one of them twice."""
    back: dict[str, str] = {}
    for theirs, ours in maps.items():
        for name, design in ((theirs, old), (ours, new)):
            if name not in design.inputs:
                raise UserError(
                    f"--map {theirs}={ours}: {design.top} has no input {name}",
                    hint=f"its inputs are {_listed(design)}",
                )
        if ours in back:
            raise UserError(f"--map {theirs}={ours}: {ours} is mapped already", hint="map it once")
        back[ours] = theirs
    return back


def _inputs(old: Ports, new: Ports, pairing: Pairing, back: Mapping[str, str]) -> list[Shared]:
    taken = set(pairing.maps.values())
    out: dict[str, Shared] = {}
    for name in old.free:
        ours = pairing.maps.get(name, name)
        # What another input is mapped to is not this one, whatever its name.
        mapped_away = name not in pairing.maps and ours in taken
        there = None if mapped_away else _counterpart(old, name, new, ours, pairing.new.holds)
        if there is None:
            raise _alone(old, new, name, "old")
        used = ours if ours in new.free else None
        out[name] = Shared(name, name, used, there, name in pairing.moving)
    for name in new.free:
        theirs = back.get(name, name)
        if theirs in out and out[theirs].new == name:
            continue
        mapped_away = name not in back and theirs in pairing.maps
        there = None if mapped_away else _counterpart(new, name, old, theirs, pairing.old.holds)
        if there is None:
            raise _alone(new, old, name, "new")
        out[theirs] = Shared(theirs, None, name, there, theirs in pairing.moving)
    return list(out.values())


def _counterpart(ports: Ports, name: str, other: Ports, there: str, held: Mapping[str, int]) -> int | None:
    """The width that both inputs have; None if the other has no such input. Raises UserError if it is another kind
    of input there."""
    if there not in other.design.inputs:
        return None
    width = ports.design.inputs[name]
    if other.design.inputs[there] != width:
        raise UserError(
            f"input {name} of {ports.design.top} has {width} bits, and {there} of {other.design.top} "
            f"{other.design.inputs[there]}",
            _where(ports.design, name),
            hint="hold one of them, or tell with --map OLDPORT=NEWPORT which inputs are the same",
        )
    role = "clock" if there == other.clock else ""
    if other.reset is not None and there == other.reset.port:
        role = "reset"
    if there in held:
        role = "held"
    if role:
        raise UserError(
            f"input {name} of {ports.design.top} is free, and {there} of {other.design.top} is {role}",
            _where(ports.design, name),
            hint="give it the same part in both with --clock, --reset, --hold or --map",
        )
    return width


def _alone(ports: Ports, other: Ports, name: str, side: str) -> UserError:
    form = f"--map {name}=PORT" if side == "old" else f"--map PORT={name}"
    return UserError(
        f"input {name} of {ports.design.top} has no counterpart in {other.design.top}",
        _where(ports.design, name),
        hint=f"tell which it is with {form}, or hold it with --{side}-hold {name}=VALUE",
    )


def _where(design: Design, name: str) -> Where | None:
    return design.signals[name].where if name in design.signals else None


def _scope(old: Ports, new: Ports, pairing: Pairing) -> Literal["reset", "initial", "any"]:
    if pairing.settled:
        return "any"
    lacking = [ports.design.top for ports in (old, new) if ports.reset is None]
    if pairing.start == "initial" or (pairing.start is None and len(lacking) == 2):
        for ports in (old, new):
            registers = ports.design.registers
            if registers and all(register.initial is None for register in registers):
                raise UserError(
                    f"{ports.design.top}: no register has an initial value",
                    registers[0].where,
                    hint="give initial values, name a reset with --reset PORT=LEVEL, or begin with --after any",
                )
        return "initial"
    if lacking:
        raise UserError(
            f"{lacking[0]} has no reset to begin with",
            hint="name it with --reset PORT=LEVEL, or begin with --start initial or --after any",
        )
    return "reset"


# -- side by side ------------------------------------------------------------------------------------------


def side_by_side(pair: Pair) -> Ports:
    """Both dividers as one, whose output is 1 where theirs differ. Its design has the outputs `old.…` and `new.…`."""
    clock = pair.old.clock
    reset = pair.old.reset if pair.scope == "reset" else None
    inputs = {clock: 1} | ({reset.port: 1} if reset else {}) | {x.name: x.width for x in pair.inputs}
    registers: list[Register] = []
    signals: dict[str, Signal] = {}
    for side, ports in zip(SIDES, (pair.old, pair.new), strict=True):
        names = _names(pair, side, ports, clock, reset)
        registers += [_renamed(register, side, names) for register in ports.design.registers]
        (value,) = e.substitute([_own_choices(ports.output_value, side)], names)
        name = f"{side}.{ports.output}"
        signals[name] = Signal(name, value, 0, 0, False, Where("", 0))
    values = [signal.value for signal in signals.values()]
    kind: Literal["asynchronous", "synchronous"] = "asynchronous"
    if reset is not None and "synchronous" in (
        reset.kind,
        pair.new.reset.kind if pair.new.reset is not None else "",
    ):
        kind = "synchronous"
    made = Design(
        top=f"{pair.old.design.top} and {pair.new.design.top}",
        inputs=inputs,
        outputs=tuple(signals),
        registers=tuple(registers),
        signals=signals,
        parameters={},
        files=(),
        sha256="",
    )
    clash = {register.name for register in registers} & set(inputs)
    if clash or len(inputs) != 1 + (reset is not None) + len(pair.inputs):
        raise UserError(
            f"inputs and registers share a name: {', '.join(sorted(clash)) or clock}", hint="rename the input"
        )
    made.sanity_check()
    both = Reset(reset.port, reset.active, kind) if reset is not None else None
    differs = e.bvxor(*values)
    free = tuple(x.name for x in pair.inputs)
    return Ports(made, clock, both, "difference", differs, {}, differs, Where("", 0), free)


def _names(pair: Pair, side: str, ports: Ports, clock: str, reset: Reset | None) -> dict[str, Expr]:
    """What stands for each name of one divider when both are side by side."""
    names = {r.name: e.var(f"{side}.{r.name}", r.width) for r in ports.design.registers}
    names[ports.clock] = e.var(clock, 1)
    if ports.reset is not None:
        if reset is None:
            names[ports.reset.port] = e.const(1 - ports.reset.active, 1)
        else:
            level = e.var(reset.port, 1)
            names[ports.reset.port] = level if ports.reset.active == reset.active else e.bvnot(level)
    for each in pair.inputs:
        own = each.old if side == "old" else each.new
        if own is not None:
            names[own] = e.var(each.name, each.width)
    return names


def _renamed(register: Register, side: str, names: Mapping[str, Expr]) -> Register:
    def there(x: Expr) -> Expr:
        return e.substitute([_own_choices(x, side)], names)[0]

    return replace(
        register,
        name=f"{side}.{register.name}",
        edges=tuple(Edge(there(edge.clock), there(edge.data)) for edge in register.edges),
        forces=tuple(Force(there(f.when), there(f.value), f.where) for f in register.forces),
    )


def _own_choices(x: Expr, side: str) -> Expr:
    """What x stands for in one divider says nothing of what it stands for in the other."""
    own = {v.name: e.var(f"?{side}.{v.name[1:]}", v.width) for v in e.variables([x]) if v.name[0] == "?"}
    return e.substitute([x], own)[0] if own else x
