"""Nodes of the syntax tree that pyverilog has none for, or whose own loses what matters.

As in pyverilog's nodes `lineno` holds an offset in the expanded text. A range is a pair of expressions,
[msb:lsb]; a single expression, as in the SystemVerilog dimension [n], has None for the second.
"""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

Node = Any
Range = tuple[Node, Node | None]


@dataclass(slots=True, eq=False)
class Type:
    """What stands before declared names: keywords (`input`, `reg`, `signed` …, or an EnumType) and ranges."""

    words: list[str]
    ranges: list[Range]
    enum: EnumType | None
    named: str | None
    lineno: int


@dataclass(slots=True, eq=False)
class EnumType:
    base: Type | None
    members: list[tuple[str, Node | None, int]]
    lineno: int


@dataclass(slots=True, eq=False)
class Named:
    """A declared name with its unpacked dimensions and its initial value."""

    name: str
    dimensions: list[Range]
    value: Node | None
    lineno: int


@dataclass(slots=True, eq=False)
class Declaration:
    type: Type
    names: list[Named]
    delay: Node | None
    lineno: int


@dataclass(slots=True, eq=False)
class Typedef:
    name: str
    type: Type
    lineno: int


@dataclass(slots=True, eq=False)
class Parameters:
    """`parameter` or `localparam`; `type` is None where only the value gives one."""

    local: bool
    type: Type | None
    names: list[Named]
    lineno: int


@dataclass(slots=True, eq=False)
class PortItem:
    """One entry of a module's or function's bracketed list; `type` is None where it is left out."""

    type: Type | None
    name: Named
    lineno: int


@dataclass(slots=True, eq=False)
class Module:
    name: str
    parameters: list[Node]
    ports: list[PortItem]
    items: list[Node]
    lineno: int


@dataclass(slots=True, eq=False)
class Primitive:
    """A user-defined primitive: its ports, declarations and initial statement, and its table as written."""

    name: str
    ports: list[PortItem]
    items: list[Node]
    table: str
    table_offset: int
    lineno: int


@dataclass(slots=True, eq=False)
class Gates:
    """Instances of a built-in gate: pairs of name and terminals."""

    kind: str
    instances: list[Instance]
    delay: Node | None
    lineno: int


@dataclass(slots=True, eq=False)
class Instance:
    """`array` is the range of an array of instances."""

    name: str
    array: Range | None
    ports: list[PortArgument]
    lineno: int


@dataclass(slots=True, eq=False)
class Instances:
    module: str
    parameters: list[PortArgument]
    instances: list[Instance]
    delay: Node | None
    lineno: int


@dataclass(slots=True, eq=False)
class PortArgument:
    """`name` is None by position and `*` for `.*`; `shorthand` marks `.name` without brackets."""

    name: str | None
    value: Node | None
    shorthand: bool
    lineno: int


@dataclass(slots=True, eq=False)
class Defparam:
    target: Node
    value: Node
    lineno: int


@dataclass(slots=True, eq=False)
class IndexedSelect:
    """`var[base +: width]`, or `-:` where `up` is False."""

    var: Node
    base: Node
    width: Node
    up: bool
    lineno: int


@dataclass(slots=True, eq=False)
class Fill:
    """`'0`, `'1`, `'x`, `'z`: as wide as its context."""

    digit: str
    lineno: int


@dataclass(slots=True, eq=False)
class Cast:
    """`type'(value)`: `type` is a keyword, or an expression that gives the width."""

    type: Node | str
    value: Node
    lineno: int


@dataclass(slots=True, eq=False)
class Always:
    """`kind` is the keyword."""

    kind: str
    statement: Node
    lineno: int


@dataclass(slots=True, eq=False)
class EventControl:
    """`@(…) statement`: events are pairs of edge (posedge, negedge or level) and expression; None is `@*`."""

    events: list[tuple[str, Node, int]] | None
    statement: Node
    lineno: int


@dataclass(slots=True, eq=False)
class DelayControl:
    delay: Node
    statement: Node
    lineno: int


@dataclass(slots=True, eq=False)
class Assignment:
    """`blocking` tells = from <=; `delay` is the delay or event control on the right, if any."""

    left: Node
    right: Node
    blocking: bool
    delay: Node | None
    lineno: int


@dataclass(slots=True, eq=False)
class For:
    """`type` is that of a loop variable declared in the loop itself."""

    start: Node | None
    condition: Node | None
    step: Node | None
    body: Node
    type: Type | None
    lineno: int


@dataclass(slots=True, eq=False)
class Repeat:
    times: Node
    body: Node
    lineno: int


@dataclass(slots=True, eq=False)
class Return:
    value: Node | None
    lineno: int


@dataclass(slots=True, eq=False)
class Null:
    lineno: int


@dataclass(slots=True, eq=False)
class Refused:
    """A statement that is recognised only to be refused: what it is."""

    what: str
    lineno: int


@dataclass(slots=True, eq=False)
class Subroutine:
    """A function, or a task where `result` is None; `ports` come from the brackets, `items` from the body."""

    name: str
    result: Type | None
    task: bool
    ports: list[PortItem]
    items: list[Node]
    lineno: int


@dataclass(slots=True, eq=False)
class GenerateBlock:
    name: str | None
    items: list[Node]
    lineno: int


@dataclass(slots=True, eq=False)
class GenerateIf:
    condition: Node
    then: Node
    other: Node | None
    lineno: int


@dataclass(slots=True, eq=False)
class GenerateFor:
    variable: str
    start: Node
    condition: Node
    step: Assignment
    body: Node
    lineno: int


@dataclass(slots=True, eq=False)
class GenerateCase:
    """Arms are pairs of labels and item; no labels is the default."""

    subject: Node
    arms: list[tuple[list[Node], Node]] = field(default_factory=list)
    lineno: int = 0
