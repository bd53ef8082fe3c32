"""Nodes of the syntax tree that pyverilog has none for, or whose own loses what matters.

As in pyverilog's nodes `lineno` holds an offset in the expanded text. A range is a pair of expressions,
[msb:lsb]; a single expression, as in the SystemVerilog dimension [n], has None for the second.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any, TypeVar, dataclass_transform

Node = Any
Range = tuple[Node, Node | None]
T = TypeVar("T")


@dataclass_transform(eq_default=False, field_specifiers=(field,))
def _node(cls: type[T]) -> type[T]:
    """A plain dataclass; what is left out makes up most of the time that importing thirty of them takes."""
    make: Callable[[type[T]], type[T]] = dataclass(eq=False, repr=False, match_args=False, slots=True)
    return make(cls)


@_node
class Type:
    """What stands before declared names: keywords (`input`, `reg`, `signed` …, or an EnumType) and ranges."""

    words: list[str]
    ranges: list[Range]
    enum: EnumType | None
    named: str | None
    lineno: int


@_node
class EnumType:
    """An enumeration: its base type, and its members with value and offset."""

    base: Type | None
    members: list[tuple[str, Node | None, int]]
    lineno: int


@_node
class Named:
    """A declared name with its unpacked dimensions and its initial value."""

    name: str
    dimensions: list[Range]
    value: Node | None
    lineno: int


@_node
class Declaration:
    """One declaration of nets, variables or genvars."""

    type: Type
    names: list[Named]
    delay: Node | None
    lineno: int


@_node
class Typedef:
    """A named type."""

    name: str
    type: Type
    lineno: int


@_node
class Parameters:
    """`parameter` or `localparam`; `type` is None where only the value gives one."""

    local: bool
    type: Type | None
    names: list[Named]
    lineno: int


@_node
class PortItem:
    """One entry of a module's or function's bracketed list; `type` is None where it is left out."""

    type: Type | None
    name: Named
    lineno: int


@_node
class Module:
    """A module."""

    name: str
    parameters: list[Node]
    ports: list[PortItem]
    items: list[Node]
    lineno: int


@_node
class Primitive:
    """A user-defined primitive: its ports, declarations and initial statement, and its table as written."""

    name: str
    ports: list[PortItem]
    items: list[Node]
    table: str
    table_offset: int
    lineno: int


@_node
class Gates:
    """Instances of a built-in gate: pairs of name and terminals."""

    kind: str
    instances: list[Instance]
    delay: Node | None
    lineno: int


@_node
class Instance:
    """`array` is the range of an array of instances."""

    name: str
    array: Range | None
    ports: list[PortArgument]
    lineno: int


@_node
class Instances:
    """Instances of one module or primitive; `delay` is a number without brackets."""

    module: str
    parameters: list[PortArgument]
    instances: list[Instance]
    delay: Node | None
    lineno: int


@_node
class PortArgument:
    """`name` is None by position and `*` for `.*`; `shorthand` marks `.name` without brackets."""

    name: str | None
    value: Node | None
    shorthand: bool
    lineno: int


@_node
class Defparam:
    """One parameter set from outside."""

    target: Node
    value: Node
    lineno: int


@_node
class IndexedSelect:
    """`var[base +: width]`, or `-:` where `up` is False."""

    var: Node
    base: Node
    width: Node
    up: bool
    lineno: int


@_node
class Fill:
    """`'0`, `'1`, `'x`, `'z`: as wide as its context."""

    digit: str
    lineno: int


@_node
class Cast:
    """`type'(value)`: `type` is a keyword, or an expression that gives the width."""

    type: Node | str
    value: Node
    lineno: int


@_node
class Always:
    """`kind` is the keyword."""

    kind: str
    statement: Node
    lineno: int


@_node
class EventControl:
    """`@(…) statement`: events are pairs of edge (posedge, negedge or level) and expression; None is `@*`."""

    events: list[tuple[str, Node, int]] | None
    statement: Node
    lineno: int


@_node
class DelayControl:
    """`#delay statement`."""

    delay: Node
    statement: Node
    lineno: int


@_node
class Assignment:
    """`blocking` tells = from <=; `delay` is the delay or event control on the right, if any."""

    left: Node
    right: Node
    blocking: bool
    delay: Node | None
    lineno: int


@_node
class For:
    """`type` is that of a loop variable declared in the loop itself."""

    start: Node | None
    condition: Node | None
    step: Node | None
    body: Node
    type: Type | None
    lineno: int


@_node
class Repeat:
    """`repeat (times) body`."""

    times: Node
    body: Node
    lineno: int


@_node
class Return:
    """`return value;`."""

    value: Node | None
    lineno: int


@_node
class Null:
    """A lone semicolon."""

    lineno: int


@_node
class Refused:
    """A statement that is recognised only to be refused: what it is."""

    what: str
    lineno: int


@_node
class Subroutine:
    """A function, or a task where `result` is None; `ports` come from the brackets, `items` from the body."""

    name: str
    result: Type | None
    task: bool
    ports: list[PortItem]
    items: list[Node]
    lineno: int


@_node
class GenerateBlock:
    """`begin … end` among a module's items."""

    name: str | None
    items: list[Node]
    lineno: int


@_node
class GenerateIf:
    """A generate if; a branch is an item, or a list of them."""

    condition: Node
    then: Node
    other: Node | None
    lineno: int


@_node
class GenerateFor:
    """A generate for; `inline` tells that the genvar is declared in its head."""

    variable: str
    start: Node
    condition: Node
    step: Assignment
    body: Node
    inline: bool
    lineno: int


@_node
class GenerateCase:
    """Arms are pairs of labels and item; no labels is the default."""

    subject: Node
    arms: list[tuple[list[Node], Node]] = field(default_factory=list)
    lineno: int = 0
