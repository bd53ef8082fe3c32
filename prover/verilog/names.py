"""What names stand for: nets, constants, routines, and the scopes that hold them."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any, NamedTuple, NoReturn

from prover.design import Note, element, ended
from prover.errors import UserError, Where
from prover.expr import Expr, var
from prover.verilog import tree
from prover.verilog.source import Source, printable

# A wider word or more state than this is a mistake or an attack, and no divider.
MAX_WIDTH = 8_192
MAX_MEMORY = 65_536
MAX_WORDS = 4_096
MAX_CALL_DEPTH = 200
MAX_NESTED = 30
MAX_NOTES = 1_000


def words(text: str) -> frozenset[str]:
    """The words of a text: a long list of names that stays readable."""
    return frozenset(text.split())


class Type(NamedTuple):
    """Width in bits and sign of a value."""

    width: int
    signed: bool


@dataclass(slots=True, eq=False)
class Report:
    """Where refusals, notes and the numbering of choices come from; one for a whole reading."""

    source: Source
    notes: dict[tuple[str, Where], Note] = field(default_factory=dict)
    choices: int = 0
    depth: int = 0

    def fail(self, message: str, at: int | Any, hint: str) -> NoReturn:
        """Refuse the input at a node or an offset."""
        raise UserError(message, self.where(at), hint)

    def where(self, at: int | Any) -> Where:
        """The place of a node or an offset."""
        return self.source.where(at if isinstance(at, int) else position(at))

    def note(self, message: str, at: int | Any) -> None:
        """Remark once what is worth knowing at a node or an offset."""
        where = self.where(at)
        if len(self.notes) == MAX_NOTES:
            message = "more remarks are left out"
        if len(self.notes) <= MAX_NOTES:
            self.notes.setdefault((message, where), Note(message, where))

    def choice(self, width: int) -> Expr:
        """A value that may be anything."""
        self.choices += 1
        return var(f"?{self.choices}", width)


def position(node: Any) -> int:
    """A node's offset in the expanded text, or that of its first part that has one."""
    while not getattr(node, "lineno", 0):
        parts = node if isinstance(node, (list, tuple)) else getattr(node, "children", tuple)()
        if not parts:
            return 0
        node = parts[0]
    return int(node.lineno)


@dataclass(slots=True, eq=False)
class Net:
    """A net or variable, flat: its full name, its word, and for a memory the bounds of its words.

    `width` counts all bits; a memory's words follow one another, the first at the bottom. `kind` is `net`,
    `variable`, or `any` for SystemVerilog's logic, which may be driven either way. `local` marks what lives
    in a function or task. `complete` is False for a port of which only the direction has been declared.
    """

    name: str
    type: Type
    msb: int
    lsb: int
    kind: str
    offset: int
    words: tuple[int, int] | None = None
    direction: str | None = None
    local: bool = False
    complete: bool = True

    @property
    def count(self) -> int:
        """Words of a memory; 1 for anything else."""
        return abs(self.words[0] - self.words[1]) + 1 if self.words else 1

    @property
    def width(self) -> int:
        return self.type.width * self.count

    @property
    def value(self) -> Expr:
        """The whole of it, as a variable of its own name."""
        return var(self.name, self.width)

    def part(self, high: int, low: int) -> str:
        """The name of the bits high..low, counted from 0, as the user would write it."""
        if self.words:
            base = element(self.name, min(self.words) + low // self.type.width)
            bits = (high % self.type.width, low % self.type.width)
            whole = bits == (self.type.width - 1, 0)
        else:
            base, bits, whole = self.name, (high, low), high - low + 1 == self.width
        if whole and high - low + 1 <= self.type.width:
            return base
        sign = 1 if self.msb >= self.lsb else -1
        upper, lower = (self.lsb + sign * bit for bit in bits)
        return element(base, upper if high == low else f"{upper}:{lower}")


@dataclass(slots=True, frozen=True)
class Constant:
    """A literal or a parameter: its bits, which of them are x or z, and its type.

    `sized` is False for a literal without a size, whose leading x or z fills any width."""

    bits: int
    x: int
    z: int
    type: Type
    sized: bool = True
    msb: int | None = None
    lsb: int = 0

    @property
    def number(self) -> int:
        """The value with its sign; x and z bits count as they stand in `bits`."""
        if self.type.signed and self.bits >> (self.type.width - 1) & 1:
            return self.bits - (1 << self.type.width)
        return self.bits


@dataclass(slots=True, frozen=True)
class Real:
    """A real constant: a double, which has no width."""

    value: float


@dataclass(slots=True, eq=False)
class Routine:
    """A function or task: the scope that holds its arguments and locals, its result, its body."""

    name: str
    scope: Scope
    result: Net | None
    arguments: list[Net]
    body: list[tree.Node]
    automatic: bool
    offset: int
    active: int = 0


@dataclass(slots=True, eq=False)
class Lazy:
    """A name worked out when first used: a parameter, whose value may need later ones, or a routine."""

    make: Callable[[], Constant | Real | Routine]
    offset: int
    value: Constant | Real | Routine | None = None
    busy: bool = False
    parameter: bool = False

    def get(self, report: Report, name: str) -> Constant | Real | Routine:
        """The constant or routine; UserError where it needs itself."""
        if self.value is None:
            if self.busy:
                report.fail(f"{printable(name)} is defined by itself", self.offset, "break the circle")
            if report.depth >= MAX_NESTED:
                report.fail(
                    f"{printable(name)} hangs on too many others",
                    self.offset,
                    "define each parameter by earlier ones",
                )
            self.busy = True
            report.depth += 1
            try:
                self.value = self.make()
            finally:
                self.busy = False
                report.depth -= 1
        return self.value


Entry = Any  # Net | Constant | Real | Routine | Lazy | Scope; a closed union would make every lookup a cast


@dataclass(slots=True, eq=False)
class Scope:
    """A module, generate block, named block or routine; `prefix` begins the full names of what it holds."""

    prefix: str
    parent: Scope | None
    kind: str
    module: str
    names: dict[str, Entry] = field(default_factory=dict)
    blocks: int = 0
    local: bool = False
    depth: int = 0

    def child(self, name: str, kind: str, module: str | None = None) -> Scope:
        """A scope inside this one; a module sees no names from outside."""
        inner = Scope(f"{self.prefix}{ended(name)}.", self, kind, module or self.module)
        inner.local = self.local or kind == "routine"
        inner.depth = self.depth + 1
        return inner

    def find(self, name: str, routine: bool = False) -> Entry | None:
        """What the name stands for here: the innermost scope up to the module decides (clause 12.7)."""
        scope: Scope | None = self
        while scope is not None:
            found = scope.names.get(name)
            if found is not None and not (routine and isinstance(found, Net)):
                return found
            scope = None if scope.kind == "module" else scope.parent
        return None

    @property
    def root(self) -> Scope:
        """The scope of the module this one belongs to."""
        scope = self
        while scope.kind != "module" and scope.parent is not None:
            scope = scope.parent
        return scope
