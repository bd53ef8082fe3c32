"""Declarations: types, nets, variables, parameters, enumerations, functions and tasks of a scope."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from typing import Any

from pyverilog.vparser import ast as vast

from prover import expr as e
from prover.errors import UserError
from prover.verilog import tree
from prover.verilog.deep import run
from prover.verilog.execute import Environment, Executor
from prover.verilog.names import (
    MAX_MEMORY,
    MAX_WIDTH,
    MAX_WORDS,
    Constant,
    Lazy,
    Net,
    Real,
    Report,
    Routine,
    Scope,
    Type,
)
from prover.verilog.sizing import Sizer, constant
from prover.verilog.source import printable

_DIRECTIONS = ("input", "output", "inout")
_NETS = {"wire", "tri", "supply0", "supply1", "wand", "wor", "triand", "trior", "tri0", "tri1", "trireg"}
_FIXED = {"integer": Type(32, True), "int": Type(32, True), "time": Type(64, False), "byte": Type(8, True),
          "shortint": Type(16, True), "longint": Type(64, True)}  # fmt: skip
_VECTORS = {"reg": "variable", "logic": "any", "bit": "any", "var": "any"}


@dataclass(slots=True, frozen=True)
class Shape:
    """What a declared type comes to. `plain` is True where it says no more than a direction; a declaration
    that is not `complete` gives a port's direction and leaves its kind to another one."""

    type: Type
    msb: int
    lsb: int
    kind: str
    direction: str | None
    plain: bool
    complete: bool = True


@dataclass(slots=True, eq=False)
class Declarer:
    """Makes nets and constants; `nets` lists every net in order, `initial` the initial values to work out,
    `drivers` the continuous assignments that come with declarations, `headed` the ports that a port list declares."""

    report: Report
    executor: Executor
    nets: list[Net] = field(default_factory=list)
    initial: list[tuple[Scope, Net, tree.Node]] = field(default_factory=list)
    drivers: list[tuple[Scope, tree.Node, tree.Node, int]] = field(default_factory=list)
    blocks: dict[tuple[int, Scope], Scope] = field(default_factory=dict)
    headed: set[Net] = field(default_factory=set)

    def env(self, scope: Scope) -> Environment:
        """Constants of a scope."""
        return Environment(self.executor, scope)

    # -- types ---------------------------------------------------------------------------------------------

    def shape(self, type_: tree.Type | None, scope: Scope) -> Shape:
        """Width, bounds, sign, kind and direction of a declared type."""
        words = list(type_.words) if type_ else []
        ranges = list(type_.ranges) if type_ else []
        at = type_.lineno if type_ else 0
        if type_ and type_.named:
            inner = scope.find(f"type {type_.named}")
            if not isinstance(inner, Shape):
                self.report.fail(
                    f"type {printable(type_.named)} isn't declared", at, "declare it before its use"
                )
            if ranges:
                self.report.fail(
                    "a range on a named type isn't supported", at, "give the range in the typedef"
                )
            direction = self._direction(words, at)
            return Shape(inner.type, inner.msb, inner.lsb, inner.kind, direction, False)
        if type_ and type_.enum:
            return self._enum(type_.enum, scope)
        if len(ranges) > 1:
            self.report.fail("more than one packed dimension isn't supported", at, "use one vector")
        fixed = [w for w in words if w in _FIXED]
        kinds = [w for w in words if w in _NETS or w in _VECTORS]
        for word in words:
            known = word in _DIRECTIONS or word in _NETS or word in _VECTORS or word in _FIXED
            if not known and word not in ("signed", "unsigned", "automatic", "static"):
                self.report.fail(f"{word} isn't supported", at, "declare a wire, a reg or an integer")
        if len(fixed) > 1 or (fixed and ranges) or len([k for k in kinds if k != "var"]) + len(fixed) > 1:
            self.report.fail(f"{' '.join(words)} makes no type", at, "use one type word and one sign")
        kind = "net"
        if fixed:
            kind = "variable" if fixed[0] in ("integer", "time") else "any"
        elif kinds:
            kind = "net" if kinds[0] in _NETS else _VECTORS[kinds[-1] if kinds[-1] != "var" else kinds[0]]
        direction = self._direction(words, at)
        if kind == "variable" and direction in ("input", "inout") and not scope.local:
            self.report.fail(
                f"an {direction} can't be declared {(kinds + fixed)[0]}", at, "leave the word out"
            )
        msb, lsb = 0, 0
        if ranges:
            msb = constant(self.env(scope), ranges[0][0], "the bound of a range")
            if ranges[0][1] is None:
                self.report.fail("a packed range needs two bounds", at, "write [msb:lsb]")
            lsb = constant(self.env(scope), ranges[0][1], "the bound of a range")
        elif fixed:
            msb = _FIXED[fixed[0]].width - 1
        width = abs(msb - lsb) + 1
        if width > MAX_WIDTH or max(abs(msb), abs(lsb)) > 1 << 40:
            self.report.fail(f"a vector of {width} bits", at, f"at most {MAX_WIDTH} are read")
        signed = "signed" in words or bool(fixed and _FIXED[fixed[0]].signed and "unsigned" not in words)
        plain = not ranges and not fixed and not kinds and "signed" not in words
        complete = bool(direction is None or kinds or fixed)
        return Shape(Type(width, signed), msb, lsb, kind, direction, plain, complete)

    def _direction(self, words: list[str], at: int) -> str | None:
        found = [w for w in words if w in _DIRECTIONS]
        if len(found) > 1:
            self.report.fail(f"{' '.join(found)}: one direction is enough", at, "keep one of them")
        return found[0] if found else None

    def _enum(self, enum: tree.EnumType, scope: Scope) -> Shape:
        base = Shape(Type(32, True), 31, 0, "any", None, False)
        if enum.base is not None:
            base = self.shape(enum.base, scope)
        following = 0
        for name, value, at in enum.members:
            number = (
                following
                if value is None
                else constant(self.env(scope), value, "the value of an enum member")
            )
            following = number + 1
            if not -(1 << base.type.width - 1) <= number < 1 << base.type.width:
                self.report.fail(
                    f"{printable(name)} = {number} doesn't fit {base.type.width} bits",
                    at,
                    "give the enum a wider base type",
                )
            bits = number & ((1 << base.type.width) - 1)
            known = scope.names.get(name)
            if known is None or not isinstance(known, Constant):
                self._add(scope, name, Constant(bits, 0, 0, base.type), at)
        return Shape(base.type, base.msb, base.lsb, "any", None, False)

    def typedef(self, node: tree.Typedef, scope: Scope) -> None:
        scope.names[f"type {node.name}"] = self.shape(node.type, scope)

    def _add(self, scope: Scope, name: str, entry: Any, at: int) -> None:
        if name in scope.names:
            self.report.fail(f"{printable(name)} is declared twice", at, "rename one of them")
        scope.names[name] = entry

    # -- nets and variables --------------------------------------------------------------------------------

    def declare(self, node: tree.Declaration, scope: Scope, ports: frozenset[str] = frozenset()) -> None:
        """The nets of a declaration; `ports` are the module's, where it lists only their names."""
        if "genvar" in node.type.words:
            for name in node.names:
                self._add(scope, name.name, "genvar", name.lineno)
            return
        if node.delay is not None:
            self.report.note("delay passed over: gates have their own", node.delay)
        shape = self.shape(node.type, scope)
        for name in node.names:
            if shape.direction and not scope.local and name.name not in ports:
                self.report.fail(
                    f"{printable(name.name)} isn't in the module's port list",
                    name.lineno,
                    "list it, or drop the direction",
                )
            net = self.net(shape, name, scope)
            if name.value is not None:
                self.first_value(net, name, scope)
            for i, word in enumerate(("supply0", "supply1")):
                if word in node.type.words:
                    value = vast.IntConst(
                        f"{net.width}'d{(1 << net.width) - 1 if i else 0}", lineno=name.lineno
                    )
                    self.drivers.append(
                        (scope, vast.Identifier(name.name, lineno=name.lineno), value, name.lineno)
                    )

    def first_value(self, net: Net, name: tree.Named, scope: Scope) -> None:
        if net.words:
            self.report.fail(
                "an initial value for a whole memory isn't supported",
                name.lineno,
                "assign its words in an initial block",
            )
        if scope.local:
            self.report.fail(
                "an initial value inside a function or task isn't supported", name.lineno, "assign it"
            )
        if net.direction == "input":
            self.report.fail("an initial value for an input isn't supported", name.lineno, "leave it out")
        if net.kind == "net":
            target = vast.Identifier(name.name, lineno=name.lineno)
            self.drivers.append((scope, target, name.value, name.lineno))
        else:
            self.initial.append((scope, net, name.value))

    def net(self, shape: Shape, name: tree.Named, scope: Scope) -> Net:
        """Declare one name, or complete a port that was declared by its direction alone or by its type."""
        known = scope.names.get(name.name)
        fits = isinstance(known, Net) and (known.direction is None) != (shape.direction is None)
        if isinstance(known, Net) and fits and not (known.complete and shape.complete):
            return self._complete(known, shape, name)
        if isinstance(known, Net) and known.direction and not shape.direction and not known.local:
            kind = " reg" if shape.kind == "variable" else ""
            self.report.fail(
                f"{printable(name.name)} is declared twice: its port declaration says all there is to say",
                name.lineno,
                f"write {known.direction}{kind} {printable(name.name)} there, and drop this declaration",
            )
        if shape.msb < 0 == shape.lsb:
            self.report.fail(
                f"{printable(name.name)}[{shape.msb}:0] has {shape.type.width} bits, which is hardly meant",
                name.lineno,
                "is a width of 0 meant?",
            )
        words = None
        if name.dimensions:
            words = self._dimension(name, scope)
            if shape.direction:
                self.report.fail(
                    f"port {printable(name.name)} can't be a memory",
                    name.lineno,
                    "pass its words as one vector",
                )
        made = Net(
            name=f"{scope.prefix}{name.name}",
            type=shape.type,
            msb=shape.msb,
            lsb=shape.lsb,
            kind=shape.kind,
            offset=name.lineno,
            words=words,
            direction=shape.direction,
            local=scope.local,
            complete=shape.complete,
        )
        if made.width > MAX_MEMORY:
            self.report.fail(f"a memory of {made.width} bits", name.lineno, f"at most {MAX_MEMORY} are read")
        self._add(scope, name.name, made, name.lineno)
        self.nets.append(made)
        return made

    def _dimension(self, name: tree.Named, scope: Scope) -> tuple[int, int]:
        if len(name.dimensions) > 1:
            self.report.fail(
                "a memory of more than one dimension isn't supported", name.lineno, "use one dimension"
            )
        left, right = name.dimensions[0]
        first = constant(self.env(scope), left, "the bound of a memory")
        if right is None:
            if first < 1:
                self.report.fail("a memory without words", name.lineno, "give it at least one word")
            first, last = 0, first - 1
        else:
            last = constant(self.env(scope), right, "the bound of a memory")
        if abs(first - last) >= MAX_WORDS:
            words = abs(first - last) + 1
            self.report.fail(f"a memory of {words} words", name.lineno, f"at most {MAX_WORDS} are read")
        return first, last

    def _complete(self, net: Net, shape: Shape, name: tree.Named) -> Net:
        """`output q; reg q;`, in either order: the two must agree (clause 12.3.3)."""
        if net.local or name.dimensions:
            self.report.fail(
                f"{printable(name.name)} is declared twice", name.lineno, "keep one of the declarations"
            )
        if (net.msb, net.lsb) != (shape.msb, shape.lsb):
            self.report.fail(
                f"{printable(name.name)} is both [{net.msb}:{net.lsb}] and [{shape.msb}:{shape.lsb}]",
                name.lineno,
                "give both the same range",
            )
        direction = net.direction or shape.direction
        kind = net.kind if net.kind != "net" else shape.kind
        if kind == "variable" and direction in ("input", "inout"):
            self.report.fail(f"an {direction} can't be declared reg", name.lineno, "leave the reg out")
        if net in self.headed:
            # Not by clause 12.3.4, but simulators and synthesis have long taken it, and in one way.
            self.report.note(
                f"{printable(name.name)} is declared again: the port list alone should say reg", name.lineno
            )
        if net.words:
            self.report.fail(
                f"port {printable(name.name)} can't be a memory", name.lineno, "pass its words as one vector"
            )
        net.direction, net.kind, net.complete = direction, kind, True
        net.type = Type(net.type.width, net.type.signed or shape.type.signed)
        return net

    # -- parameters ----------------------------------------------------------------------------------------

    def parameters(
        self, node: tree.Parameters, scope: Scope, outer: Mapping[str, Constant | Real], used: set[str]
    ) -> list[str]:
        """Declare parameters, worked out when first used; `outer` overrides them. Returns the names."""
        for name in node.names:
            given = None
            if not node.local and name.name in outer:
                given = outer[name.name]
                used.add(name.name)
            if name.value is None and given is None:
                self.report.fail(
                    f"parameter {printable(name.name)} has no value",
                    name.lineno,
                    "write parameter NAME = value",
                )
            if name.dimensions:
                self.report.fail(
                    "a parameter array isn't supported", name.lineno, "use one parameter for each value"
                )
            make = self._parameter(node.type, name, scope, given)
            self._add(scope, name.name, Lazy(make, name.lineno, parameter=True), name.lineno)
        return [] if node.local else [name.name for name in node.names]

    def settle(self, scope: Scope) -> None:
        """Work out a scope's parameters in order, so that none has to wait for a long row of others."""
        for name, entry in list(scope.names.items()):
            if isinstance(entry, Lazy) and entry.parameter:
                try:
                    entry.get(self.report, name)
                except UserError:
                    # What can't be read is no harm unless it is used; then the error comes again.
                    continue

    def _parameter(
        self, type_: tree.Type | None, name: tree.Named, scope: Scope, given: Constant | Real | None
    ) -> Callable[[], Constant | Real]:
        def make() -> Constant | Real:
            what = f"parameter {printable(name.name)}"
            sizer = Sizer(self.env(scope))
            value = given or run(sizer.constant(name.value, what))
            if type_ is None:
                return value
            if type_.words == ["real"] and not type_.ranges and not type_.named:
                return value if isinstance(value, Real) else Real(sizer.as_real(value.number, name.lineno))
            shape = self.shape(type_, scope)
            if shape.plain and not type_.named and not type_.enum:
                return value
            if isinstance(value, Real):
                if (not type_.ranges and type_.words == ["signed"]) or type_.enum or type_.named:
                    self.report.fail(
                        f"{what} is the real number {value.value}", name.lineno, "give it a range"
                    )
                bits = sizer.rounded(value.value, shape.type, name.lineno)
                bits &= (1 << shape.type.width) - 1
                return Constant(bits, 0, 0, shape.type, True, shape.msb, shape.lsb)
            if not type_.ranges and type_.words == ["signed"]:
                return Constant(value.bits, value.x, value.z, Type(value.type.width, True))
            planes = [e.resize(e.const(p, value.type.width), shape.type.width, value.type.signed).value
                      for p in (value.bits, value.x, value.z)]  # fmt: skip
            cut = Constant(planes[0], planes[1], planes[2], shape.type, True, shape.msb, shape.lsb)
            if cut.number != value.number and value.number >> shape.type.width not in (0, -1):
                self.report.note(
                    f"{what} = {value.number} is cut to {shape.type.width} bits: {cut.number}", name.lineno
                )
            return cut

        return make

    # -- functions, tasks, blocks --------------------------------------------------------------------------

    def routine(self, node: tree.Subroutine, scope: Scope) -> None:
        """Declare a function or task, worked out when first called."""
        self._add(scope, node.name, Lazy(lambda: self._routine(node, scope), node.lineno), node.lineno)

    def _routine(self, node: tree.Subroutine, scope: Scope) -> Routine:
        inner = scope.child(node.name, "routine")
        result = None
        words = node.result.words if node.result else []
        task = node.task or "void" in words
        if not task:
            shape = self.shape(node.result, scope)
            result = self.net(Shape(shape.type, shape.msb, shape.lsb, "variable", None, False),
                              tree.Named(node.name, [], None, node.lineno), inner)  # fmt: skip
        arguments: list[Net] = []
        previous: tree.Type | None = None
        for item in node.ports:
            previous = item.type or previous
            arguments.append(self._argument(previous, item.name, inner, node))
        declared = (tree.Declaration, tree.Parameters)
        for item in node.items:
            if isinstance(item, tree.Parameters):
                self.parameters(item, inner, {}, set())
            elif isinstance(item, tree.Declaration):
                directed = any(w in _DIRECTIONS for w in item.type.words)
                for name in item.names:
                    if directed:
                        arguments.append(self._argument(item.type, name, inner, node))
                    else:
                        self.declare(tree.Declaration(item.type, [name], None, item.lineno), inner)
        if not task and any(a.direction in ("output", "inout") for a in arguments):
            self.report.fail(f"function {printable(node.name)} has outputs", node.lineno, "write a task")
        body = [item for item in node.items if not isinstance(item, declared)]
        return Routine(node.name, inner, result, arguments, body, "automatic" in words, node.lineno)

    def _argument(
        self, type_: tree.Type | None, name: tree.Named, inner: Scope, node: tree.Subroutine
    ) -> Net:
        shape = self.shape(type_, inner)
        direction = shape.direction or "input"
        # Inside the routine an argument is a variable like any other.
        made = self.net(Shape(shape.type, shape.msb, shape.lsb, "variable", None, False), name, inner)
        made.direction = direction if direction != "input" else "argument"
        return made

    def block(self, scope: Scope, block: Any, items: list[Any]) -> Scope:
        """The scope of a block with a name or declarations; the same one each time the block runs."""
        key = (id(block), scope)
        if key not in self.blocks:
            name = getattr(block, "scope", None)
            if name is None:
                name = f"unnamed{len(self.blocks) + 1}"
            inner = scope.child(name, "block")
            scope.names.setdefault(name, inner)
            self.blocks[key] = inner
            for item in items:
                if isinstance(item, tree.Parameters):
                    self.parameters(item, inner, {}, set())
                else:
                    self.declare(item, inner)
        return self.blocks[key]
