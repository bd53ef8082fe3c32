"""Design: a divider after elaboration, flat, with every register and where each name was written.

Names are hierarchical, without the top module's own name: `count`, `stage0.q`. A vector of which parts have
different drivers is split into slices, named `count[0]` or `count[7:4]`, each of them one register or wire.
Wires are gone: what was a wire is an expression over registers and inputs. A net inside a combinational loop
becomes a register without a clock, forced all the time to the value that drives it.

Expressions are simplified, which changes no value but may take away what pulses on the way. So gate primitives are
kept besides as they are written: `gates` has them, and what hangs on them is written over the nets that they drive.

An escaped identifier keeps its backslash, and where more follows in a name the blank that ends it (IEEE 1364-2005
clause 3.7.1): `\\a.b` is one identifier, `\\a.b .q` the q in an instance of that name, `\\a.b [3]` a bit.
"""

from __future__ import annotations

import re
from dataclasses import dataclass, field
from typing import Literal

from prover.errors import InternalError, Where
from prover.expr import Expr, variables

GateKind = Literal["and", "nand", "or", "nor", "xor", "xnor", "buf", "not"]
"""Gate primitives with one output value: IEEE 1364-2005 clause 7.2 and 7.3."""


_COMPONENT = re.compile(r"(\\\S+|[^.\[\s\\]+)( ?(?:\[[^\]]*\])*)(?:\.|$)")


def ended(name: str) -> str:
    """The name as it has to stand where more follows: with the blank that ends an escaped identifier."""
    return f"{name} " if "\\" in name.rpartition(" ")[2] else name


def element(name: str, index: int | str) -> str:
    """The name of one element, or one bit, or bits `high:low`."""
    return f"{ended(name)}[{index}]"


def components(name: str) -> list[tuple[str, str]]:
    """The identifiers that a hierarchical name is made of, each with the indices that follow it (`[3]`), if any."""
    out: list[tuple[str, str]] = []
    at = 0
    while at < len(name) and (found := _COMPONENT.match(name, at)):
        out.append((found[1], found[2].strip()))
        at = found.end()
    return out if at >= len(name) and out else [(name, "")]


@dataclass(frozen=True, slots=True)
class Edge:
    """A clocked write: when `clock` (one bit) rises, the register takes `data`. A falling edge is written
    as the rise of the negated net. `data` is the register itself where the code assigns nothing."""

    clock: Expr
    data: Expr


@dataclass(frozen=True, slots=True)
class Force:
    """A level-sensitive write: while `when` (one bit) is 1 the register is held at `value`.

    Asynchronous sets and clears, latches (`when` is the enable, `value` the data) and nets in combinational
    loops (`when` is constant 1) are all of this form."""

    when: Expr
    value: Expr
    where: Where
    written: Expr | None = None
    """The value over the nets that gates drive, where it is another then."""


@dataclass(frozen=True, slots=True)
class Gate:
    """A gate primitive. `pins` are what its input terminals carry, a bit each, over registers, inputs and the nets of
    gates."""

    kind: GateKind
    pins: tuple[Expr, ...]
    where: Where


@dataclass(frozen=True, slots=True)
class Register:
    """Anything that stores. The first active force in the list wins over the others and over every edge.

    `primitive` marks the state of a user-defined primitive, which nothing outside it can set."""

    name: str
    width: int
    kind: Literal["flip-flop", "latch", "loop"]
    edges: tuple[Edge, ...]
    forces: tuple[Force, ...]
    initial: int | None
    where: Where
    primitive: bool = False


@dataclass(frozen=True, slots=True)
class Signal:
    """A declared name as the user sees it: its value is an expression over registers and inputs.

    `msb` and `lsb` are the declared bounds (0, 0 for a scalar); bit i of `value` is declared bit lsb + i, or
    lsb − i where msb < lsb. `written` is the value over the nets that gates drive, where it is another then;
    `driven` is where its driver stands."""

    name: str
    value: Expr
    msb: int
    lsb: int
    signed: bool
    where: Where
    written: Expr | None = None
    driven: Where | None = None


@dataclass(frozen=True, slots=True)
class Note:
    """A remark that accompanies the verdict, such as a simulation-only construct that was passed over."""

    message: str
    where: Where


@dataclass(frozen=True, slots=True)
class Design:
    """An elaborated divider.

    inputs      input ports of the top module: name to width
    outputs     output ports of the top module, in order; each is also in signals
    registers   in order of declaration
    signals     every declared name with its value, in order of declaration
    parameters  the top module's parameters with their final values
    files       every file read, in order
    sha256      digest of the sources after directives
    gates       gate primitives by the net (one bit) that each drives
    """

    top: str
    inputs: dict[str, int]
    outputs: tuple[str, ...]
    registers: tuple[Register, ...]
    signals: dict[str, Signal]
    parameters: dict[str, int]
    files: tuple[str, ...]
    sha256: str
    notes: tuple[Note, ...] = field(default=())
    gates: dict[str, Gate] = field(default_factory=dict)

    @property
    def state_bits(self) -> int:
        """Bits of all registers together; the clock's level is not counted."""
        return sum(register.width for register in self.registers)

    def sanity_check(self) -> None:
        """Raise InternalError where a width or a reference is wrong."""
        known = {r.name: r.width for r in self.registers} | self.inputs
        if len(known) != len(self.registers) + len(self.inputs):
            raise InternalError("a name stands for two things")
        for register in self.registers:
            for edge in register.edges:
                if edge.clock.width != 1 or edge.data.width != register.width:
                    raise InternalError(f"{register.name}: edge of wrong width")
            for force in register.forces:
                if force.when.width != 1 or force.value.width != register.width:
                    raise InternalError(f"{register.name}: force of wrong width")
        for used in variables(self.all_expressions()):
            if not used.name.startswith("?") and known.get(used.name) != used.width:
                raise InternalError(f"unknown name {used.name}")
        for used in variables(self.written_expressions()):
            net = 1 if used.name in self.gates else known.get(used.name)
            if not used.name.startswith("?") and net != used.width:
                raise InternalError(f"unknown net {used.name}")

    def all_expressions(self) -> list[Expr]:
        """Every expression of the design, in a stable order."""
        out: list[Expr] = []
        for register in self.registers:
            for edge in register.edges:
                out += [edge.clock, edge.data]
            for force in register.forces:
                out += [force.when, force.value]
        return out + [signal.value for signal in self.signals.values()]

    def written_expressions(self) -> list[Expr]:
        """Every expression over the nets of gates, in a stable order."""
        out = [force.written for register in self.registers for force in register.forces]
        out += [signal.written for signal in self.signals.values()]
        pins = [pin for gate in self.gates.values() for pin in gate.pins]
        return [x for x in out if x is not None] + pins

    def __str__(self) -> str:
        lines = [f"design {self.top}"]
        lines += [f"input {name} {width}" for name, width in self.inputs.items()]
        for r in self.registers:
            lines.append(
                f"{r.kind} {r.name} {r.width}" + (f" initial {r.initial}" if r.initial is not None else "")
            )
            lines += [f"  force {f.when} to {f.value}" for f in r.forces]
            lines += [f"  rise {e.clock} takes {e.data}" for e in r.edges]
        lines += [f"output {name} = {self.signals[name].value}" for name in self.outputs]
        return "\n".join(lines) + "\n"
