"""The divider inside a test bench: what its ports are connected to, and how a state is put into it.

A register is forced, to the opposite of its value first so that combinational processes see a change, and released a
moment later. What is forced heeds no process, so nothing comes of the edges that this makes; once released a variable
keeps its value until a process assigns one. Words of memories can't be forced; they are assigned last.
"""

from __future__ import annotations

import re
from collections.abc import Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass, field

from prover import expr as e
from prover.design import Signal, components, ended
from prover.findings import Report
from prover.output import harmless
from prover.report.look import ASCII_TEXT

WIDTH = 64
"""Bits of a bench's counters, and more for longer times."""

_OWN = """
HALF_CYCLES BEGINS t out last failed as_reported running rose spans rising first odd moves began wanted whole changes
kept back seen other run_again settled shown registers dut observe verdict ends_badly moved shortest longest
"""
RESERVED = frozenset(_OWN.split())
"""Names that a bench has for itself."""


@dataclass(frozen=True, slots=True)
class Scene:
    """What is played in a bench.

    start         how the start comes about
    about         how it is played, for the head of the file
    level         the clock's, to begin with
    code          tasks and processes. They set `failed` and `as_reported`, and call the task `verdict` in the end
    passed        what is printed of a divider on which the claim holds, and the values in it
    moving        inputs that move, with their first values
    parameters    with their values
    declarations  of variables
    failed        statements of the verdict where the claim does not hold
    """

    start: str
    about: Sequence[str]
    level: int
    code: Sequence[str]
    passed: tuple[str, str]
    moving: Mapping[str, int] = field(default_factory=dict)
    parameters: Mapping[str, int] = field(default_factory=dict)
    declarations: Sequence[str] = ()
    failed: Sequence[str] = ()


class NoBench(Exception):
    """Why a refutation has no test bench."""


Values = Mapping[str, int]


class Dut:
    """The instance `dut` of the divider that a report is about.

    local   what each input port is connected to, by port
    shown   the declaration of `shown`, which is the output. Tasks use it, and `registers` below, in place of paths,
            which not every simulator finds from inside a task where a generate block has no name
    wholes  the declared names that registers are, or are parts of, by their path in the bench
    """

    def __init__(self, report: Report) -> None:
        self.report, self.ports, self.design = report, report.ports, report.ports.design
        for register in self.design.registers:
            if register.primitive:
                raise NoBench(
                    f"{register.name} is the state of a user-defined primitive, which nothing can set"
                )
        self.local = {name: ended(_apart(name, self.design.inputs)) for name in self.design.inputs}
        self.clock = self.local[self.ports.clock]
        self.shown = f"wire shown = dut.{ended(self.ports.output)};"
        found = [self.whole(register.name) for register in self.design.registers]
        self.wholes = {f"dut.{ended(signal.name)}": signal for signal in found}

    def whole(self, name: str) -> Signal:
        """The declared name that a register is, or is a part of."""
        signals = self.design.signals
        found = signals.get(name) or signals.get(name.rpartition("[")[0].rstrip(" "))
        if found is None:
            raise NoBench(f"{name} is no name in the sources")
        return found

    def path(self, name: str) -> str:
        """Where in the bench the declared name is that a register belongs to."""
        return f"dut.{ended(self.whole(name).name)}"

    def instance(self, level: int, moving: Values) -> Iterator[str]:
        """The ports and the instance: the clock at a level to begin with, inputs that move with their first values,
        all others held."""
        # Given a value where it is declared, the clock makes no edge from x when the simulation begins.
        yield f"reg {self.clock} = 1'b{level};"
        for name, value in self.ports.running.values:
            width = self.design.inputs[name]
            size = f"[{width - 1}:0] " if width > 1 else ""
            word = "reg" if name in moving else "wire"
            yield f"{word} {size}{self.local[name]} = {width}'h{moving.get(name, value):x};"
        given = ", ".join(f".{ended(n)}({_constant(v)})" for n, v in self.report.spec.parameters.items())
        wires = ", ".join(f".{ended(name)}({self.local[name]})" for name in self.design.inputs)
        yield f"{ended(self.design.top)} {f'#({given}) ' if given else ''}dut ({wires});"

    def state(self, registers: Values, inputs: Values | None = None) -> dict[str, tuple[int, int]]:
        """Width and value of everything that is set for a state, by path. What the state says nothing of, because the
        output does not depend on it, is 0; inputs are those of the running divider unless given."""
        words = [signal.value for signal in self.wholes.values()]
        known = dict(self.ports.running.values) if inputs is None else dict(inputs)
        known |= {name: value for name, value in registers.items() if name not in known}
        known = {v.name: known.get(v.name, 0) for v in e.variables(words)}
        return {
            path: (word.width, value)
            for path, word, value in zip(self.wholes, words, e.evaluate(words, known), strict=True)
        }

    def set(self, registers: Values, inputs: Values | None = None) -> Iterator[str]:
        """Statements that put a state into the registers; they take two units of time."""
        state = self.state(registers, inputs)
        memories = {path for path, signal in self.wholes.items() if components(signal.name)[-1][1]}
        for flipped in (True, False):
            for path, (width, value) in state.items():
                if path not in memories:
                    yield f"force {path} = {word(width, value ^ ((1 << width) - 1) if flipped else value)};"
            yield "#1;"
        yield from (f"release {path};" for path in state if path not in memories)
        yield from (f"{path} = {word(*state[path])};" for path in state if path in memories)

    @property
    def registers(self) -> str:
        """The declaration of `registers`, all of them as one word, the first uppermost."""
        return f"wire [{self.bits - 1}:0] registers = {{{', '.join(self.wholes)}}};"

    @property
    def bits(self) -> int:
        """The width of that."""
        return max(1, sum(signal.value.width for signal in self.wholes.values()))


def _apart(name: str, others: Collection[str]) -> str:
    """The name, or where the bench has one like it that name and as many underscores as tell it from all others."""
    if name not in RESERVED:
        return name
    while name in RESERVED or name in others:
        name += "_"
    return name


# -- texts -------------------------------------------------------------------------------------------------


def word(width: int, value: int) -> str:
    """A constant of so many bits."""
    return f"{width}'h{value:x}"


def number(value: int) -> str:
    """A time, or another number of the counters' width."""
    return f"{max(WIDTH, value.bit_length() + 1)}'d{value}"


def register(name: str) -> str:
    """The declaration of a counter."""
    return f"reg [{WIDTH - 1}:0] {name};"


def names(declarations: Sequence[str]) -> Iterator[str]:
    """The variables that are declared."""
    for line in declarations:
        yield from re.sub(r"^\w+ (\[.*?\] )?", "", line).rstrip(";").split(", ")


def _constant(value: int) -> str:
    """A parameter's value, which may be negative, as an expression."""
    if -(1 << 31) <= value < 1 << 31:
        return str(value)
    width = abs(value).bit_length() + 1
    return f"{'-' if value < 0 else ''}{width}'sd{abs(value)}"


def came(said: str, values: str, as_reported: str, indent: int = 0) -> list[str]:
    """Statements that tell what came in place of what is claimed."""
    blanks = " " * indent
    return [
        f'{blanks}$display("came:    {said}"{f", {values}" if values else ""});',
        f"{blanks}as_reported = {as_reported};",
        f"{blanks}failed = 1'b1;",
    ]


def plain(text: str) -> str:
    """Text that can stand in a comment of one line."""
    ascii_only = harmless(text).translate(ASCII_TEXT).encode("ascii", "backslashreplace").decode("ascii")
    return ascii_only.replace("\n", "\\n")


def literal(text: str) -> str:
    """Text inside a string that $display prints: what would end it or stand for a value is escaped."""
    return plain(text).replace("\\", "\\\\").replace('"', '\\"').replace("%", "%%")
