"""The hierarchy laid flat: instances, generate constructs and ports of the top module downwards.

Every module instance and generate block becomes a scope of its own with its nets; what drives them is only
collected here, as places in the tree with the scope they are read in, and worked out when all names exist.
"""

from __future__ import annotations

from collections.abc import Callable, Iterable, Mapping
from dataclasses import dataclass, field
from typing import Any

from pyverilog.vparser import ast as vast

from prover.design import element
from prover.verilog import tree
from prover.verilog.declare import Declarer
from prover.verilog.deep import run
from prover.verilog.execute import Environment, Executor
from prover.verilog.names import Constant, Net, Real, Report, Scope, Type
from prover.verilog.sizing import Sizer, constant
from prover.verilog.source import printable

MAX_DEPTH = 64
MAX_BLOCKS = 200
MAX_SCOPES = 10_000


@dataclass(slots=True, frozen=True)
class Connection:
    """A port of an instance and what stands at it; of `count` instances in an array this one is number
    `index` from the right."""

    port: Net
    inner: Scope
    outer: Scope
    value: tree.Node
    index: int
    count: int
    at: int


@dataclass(slots=True, frozen=True)
class Primitive:
    """A gate or a user-defined primitive with its terminals."""

    kind: str
    table: tree.Primitive | None
    scope: Scope
    terminals: list[tree.Node]
    index: int
    count: int
    at: int


@dataclass(slots=True)
class Hierarchy:
    """What elaboration of the top module finds: what drives nets, with the scope it is read in."""

    report: Report
    modules: Callable[[str], tree.Module | tree.Primitive | None]
    executor: Executor
    declarer: Declarer
    assigns: list[tuple[Scope, tree.Node, tree.Node, int]] = field(default_factory=list)
    processes: list[tuple[Scope, tree.Always]] = field(default_factory=list)
    initials: list[tuple[Scope, tree.Node]] = field(default_factory=list)
    connections: list[Connection] = field(default_factory=list)
    primitives: list[Primitive] = field(default_factory=list)
    scopes: int = 0
    _pending: list[tuple[Scope, list[Any], dict[tuple[str, ...], Any], int]] = field(default_factory=list)
    _defparams: list[tuple[tree.Defparam, Constant | Real]] = field(default_factory=list)
    _used: set[int] = field(default_factory=set)

    def elaborate(
        self, top: tree.Module, parameters: Mapping[str, Constant | Real]
    ) -> tuple[Scope, list[Net], list[str]]:
        """Lay the top module flat: its scope, its ports and its parameters' names, in order."""
        scope = Scope("", None, "module", top.name)
        ports, names = self._module(top, scope, parameters, {}, 0)
        wrong = [name for name in parameters if name not in names]
        if wrong:
            known = ", ".join(names) or "none"
            self.report.fail(
                f"{top.name} has no parameter {printable(wrong[0])}", top.lineno, f"it has: {known}"
            )
        while self._pending:
            self._items(*self._pending.pop())
        for item, value in self._defparams:
            if id(value) not in self._used:
                self.report.fail("this defparam names no instance below here", item, "check its path")
        self.assigns += self.declarer.drivers
        self._implicit_nets()
        return scope, ports, names

    # -- modules -------------------------------------------------------------------------------------------

    def _module(
        self,
        module: tree.Module,
        scope: Scope,
        outer: Mapping[str, Constant | Real],
        defparams: dict[tuple[str, ...], Any],
        depth: int,
    ) -> tuple[list[Net], list[str]]:
        used: set[str] = set()
        names: list[str] = []
        previous: tree.Parameters | None = None
        for header in module.parameters:
            if header.lineno < 0 and previous is not None:
                header = tree.Parameters(previous.local, previous.type, header.names, header.lineno)
            names += self.declarer.parameters(header, scope, outer, used)
            previous = header
        items = list(_flat(module.items))
        # With parameters in the header those in the body are local (clause 4.10.1).
        for item in items:
            if isinstance(item, tree.Parameters):
                local = item.local or bool(module.parameters)
                item = tree.Parameters(local, item.type, item.names, item.lineno)
                names += self.declarer.parameters(item, scope, outer, used)
        self._types(items, scope)
        ansi = any(item.type is not None for item in module.ports)
        ports = self._ansi_ports(module, scope) if ansi else []
        listed = frozenset() if ansi else frozenset(item.name.name for item in module.ports)
        self._nets(items, scope, listed)
        if not ansi:
            ports = self._listed_ports(module, scope)
        unknown = [name for name in outer if name not in used]
        if unknown and scope.prefix:
            self.report.fail(
                f"{printable(module.name)} has no parameter {printable(unknown[0])}",
                module.lineno,
                "correct the name of the parameter",
            )
        self._pending.append((scope, items, defparams, depth))
        return ports, names

    def _ansi_ports(self, module: tree.Module, scope: Scope) -> list[Net]:
        ports: list[Net] = []
        type_: tree.Type | None = None
        direction: str | None = None
        for item in module.ports:
            if item.type is not None:
                type_ = item.type
                shape = self.declarer.shape(type_, scope)
                direction = shape.direction or direction
            if direction is None or type_ is None:
                self.report.fail(
                    f"port {printable(item.name.name)} has no direction",
                    item.lineno,
                    "write input or output before it",
                )
            words = [w for w in type_.words if w not in ("input", "output", "inout")]
            typed = tree.Type([direction, *words], type_.ranges, type_.enum, type_.named, type_.lineno)
            net = self.declarer.net(self.declarer.shape(typed, scope), item.name, scope)
            # `output q` alone may yet become a reg.
            net.complete = net.complete or net.direction != "output"
            self.declarer.headed.add(net)
            if item.name.value is not None:
                self.declarer.first_value(net, item.name, scope)
            ports.append(net)
        return ports

    def _listed_ports(self, module: tree.Module, scope: Scope) -> list[Net]:
        ports: list[Net] = []
        for item in module.ports:
            net = scope.names.get(item.name.name)
            name = printable(item.name.name)
            if item.name.dimensions or item.name.value is not None:
                self.report.fail(
                    f"port {name} isn't a plain name", item.lineno, "declare its range in the module"
                )
            if not isinstance(net, Net) or net.direction is None:
                self.report.fail(
                    f"port {name} has no direction", item.lineno, f"declare input {name} or output {name}"
                )
            if net in ports:
                self.report.fail(f"port {name} is listed twice", item.lineno, "list it once")
            ports.append(net)
        return ports

    # -- items ---------------------------------------------------------------------------------------------

    def _types(self, items: list[Any], scope: Scope) -> None:
        """What ranges may hang on: types and routines, and then the parameters' values."""
        for item in items:
            if isinstance(item, tree.Typedef):
                self.declarer.typedef(item, scope)
            elif isinstance(item, tree.Subroutine):
                self.declarer.routine(item, scope)
        self.declarer.settle(scope)

    def _nets(self, items: list[Any], scope: Scope, ports: frozenset[str]) -> None:
        for item in items:
            if isinstance(item, tree.Declaration):
                self.declarer.declare(item, scope, ports)

    def _items(
        self, scope: Scope, items: list[Any], defparams: dict[tuple[str, ...], Any], depth: int
    ) -> None:
        """Take in the items of a scope whose declarations are made; what is inside waits its turn."""
        self.scopes += 1
        if self.scopes > MAX_SCOPES:
            self.report.fail(
                f"more than {MAX_SCOPES} instances and generate blocks",
                items[0] if items else 0,
                "generate less",
            )
        for item in items:
            if isinstance(item, tree.Defparam):
                path = [*self._path(item.target, scope), item.target.name]
                value = run(Sizer(self.declarer.env(scope)).constant(item.value, "a defparam's value"))
                defparams = {**defparams, tuple(path): value}
                self._defparams.append((item, value))
        for item in items:
            if isinstance(item, vast.Assign):
                if item.ldelay is not None:
                    self.report.note("delay passed over: gates have their own", item.ldelay)
                self.assigns.append((scope, item.left, item.right, item.lineno))
            elif isinstance(item, tree.Always):
                self.processes.append((scope, item))
            elif isinstance(item, vast.Initial):
                self.initials.append((scope, item.statement))
            elif isinstance(item, tree.Gates):
                self._gates(item, scope)
            elif isinstance(item, tree.Instances):
                self._instances(item, scope, defparams, depth)
            elif isinstance(item, (tree.GenerateIf, tree.GenerateCase, tree.GenerateFor, tree.GenerateBlock)):
                self._generate(item, scope, defparams, depth)
            elif isinstance(item, vast.SystemCall):
                self.report.note(f"${printable(item.syscall)} passed over: it only serves simulation", item)

    def _path(self, node: Any, scope: Scope) -> Iterable[str]:
        for label in node.scope.labellist if node.scope else ():
            if label.loop is None:
                yield label.name
            else:
                yield element(
                    label.name, constant(self.declarer.env(scope), label.loop, "an index in a path")
                )

    def _open(
        self, scope: Scope, name: str, at: int, kind: str = "block", module: str | None = None
    ) -> Scope:
        if name in scope.names:
            self.report.fail(f"{printable(name)} is declared twice", at, "rename one of them")
        if scope.depth >= MAX_BLOCKS:
            self.report.fail(f"blocks nest more than {MAX_BLOCKS} deep", at, "nest less")
        inner = scope.child(name, kind, module)
        scope.names[name] = inner
        return inner

    # -- generate ------------------------------------------------------------------------------------------

    def _generate(self, item: Any, scope: Scope, defparams: dict[tuple[str, ...], Any], depth: int) -> None:
        env = self.declarer.env(scope)
        nested = False
        while isinstance(item, (tree.GenerateIf, tree.GenerateCase)):
            if not nested:
                scope.blocks += 1
            nested = True
            if isinstance(item, tree.GenerateIf):
                holds = constant(env, item.condition, "the condition of a generate if")
                item = item.then if holds else item.other
            else:
                item = self._arm(item, env)
            if isinstance(item, list):
                item = item[0] if len(item) == 1 else tree.GenerateBlock(None, item, 0)
        if isinstance(item, tree.GenerateFor):
            if not nested:
                scope.blocks += 1
            self._generate_for(item, scope, defparams, depth)
        elif isinstance(item, tree.GenerateBlock):
            if not nested and item.name is None:
                self._enter(list(_flat(item.items)), scope, defparams, depth)
            else:
                name = item.name or f"genblk{scope.blocks}"
                inner = self._open(scope, name, item.lineno)
                self._enter(list(_flat(item.items)), inner, _below(defparams, name), depth)
        elif item is not None and not isinstance(item, tree.Null):
            name = f"genblk{scope.blocks}"
            inner = self._open(scope, name, item.lineno)
            self._enter(list(_flat([item])), inner, _below(defparams, name), depth)

    def _arm(self, item: tree.GenerateCase, env: Environment) -> Any:
        default = None
        for labels, body in item.arms:
            if not labels:
                default = body
            for label in labels:
                test = vast.Eql(item.subject, label, lineno=item.lineno)
                if constant(env, test, "the label of a generate case"):
                    return body
        return default

    def _generate_for(
        self, item: tree.GenerateFor, scope: Scope, defparams: dict[tuple[str, ...], Any], depth: int
    ) -> None:
        if not item.inline and scope.find(item.variable) != "genvar":
            name = printable(item.variable)
            self.report.fail(f"{name} isn't a genvar", item.lineno, f"declare genvar {name}")
        body = item.body
        if isinstance(body, list):
            body = tree.GenerateBlock(None, body, item.lineno)
        block = (
            body if isinstance(body, tree.GenerateBlock) else tree.GenerateBlock(None, [body], item.lineno)
        )
        label = block.name or f"genblk{scope.blocks}"
        turn = scope.child(label, "block")
        value = constant(self.declarer.env(scope), item.start, "the start of a generate for")
        if not isinstance(item.step.left, vast.Identifier) or item.step.left.name != item.variable:
            self.report.fail("a generate for must step its own variable", item.step, "write i = i + 1")
        opened: list[tuple[Scope, str]] = []
        seen: set[int] = set()
        while True:
            turn.names[item.variable] = Constant(value & 0xFFFFFFFF, 0, 0, Type(32, True))
            if not constant(self.declarer.env(turn), item.condition, "the condition of a generate for"):
                break
            if value in seen or self.scopes + len(opened) > MAX_SCOPES:
                what = f"more than {MAX_SCOPES} instances and generate blocks"
                self.report.fail(
                    "this generate for never ends" if value in seen else what,
                    item.lineno,
                    "its step must move towards its end",
                )
            seen.add(value)
            name = element(label, value)
            inner = self._open(scope, name, item.lineno)
            inner.names[item.variable] = turn.names[item.variable]
            opened.append((inner, name))
            value = constant(self.declarer.env(turn), item.step.right, "the step of a generate for")
        for inner, name in reversed(opened):
            self._enter(list(_flat(block.items)), inner, _below(defparams, name), depth)

    def _enter(
        self, items: list[Any], scope: Scope, defparams: dict[tuple[str, ...], Any], depth: int
    ) -> None:
        for item in items:
            if isinstance(item, tree.Parameters):
                self.declarer.parameters(item, scope, {}, set())
        self._types(items, scope)
        self._nets(items, scope, frozenset())
        self._pending.append((scope, items, defparams, depth))

    # -- instances and gates -------------------------------------------------------------------------------

    def _gates(self, item: tree.Gates, scope: Scope) -> None:
        if item.delay is not None:
            self.report.note("delay passed over: gates have their own", item.delay)
        for instance in item.instances:
            for index, count in self._array(instance, scope):
                terminals = [port.value for port in instance.ports]
                if any(port.name is not None for port in instance.ports) or None in terminals:
                    self.report.fail(
                        f"a {item.kind} gate takes its terminals by position",
                        instance.lineno,
                        "write only the nets",
                    )
                self.primitives.append(
                    Primitive(item.kind, None, scope, terminals, index, count, instance.lineno)
                )

    def _array(self, instance: tree.Instance, scope: Scope) -> list[tuple[int, int]]:
        """Index from the right and number of instances, for each of them."""
        if instance.array is None:
            return [(0, 1)]
        left, right = (
            constant(self.declarer.env(scope), bound, "the range of an instance array")
            for bound in instance.array
        )
        count = abs(left - right) + 1
        if count > MAX_SCOPES:
            self.report.fail(
                f"more than {MAX_SCOPES} instances and generate blocks", instance.lineno, "generate less"
            )
        return [(i, count) for i in range(count)]

    def _instances(
        self, item: tree.Instances, scope: Scope, defparams: dict[tuple[str, ...], Any], depth: int
    ) -> None:
        module = self.modules(item.module)
        if module is None:
            shown = printable(item.module)
            self.report.fail(
                f"module {shown} isn't defined", item.lineno, f"name the file that holds {shown}"
            )
        if depth >= MAX_DEPTH:
            self.report.fail(
                f"instances nest more than {MAX_DEPTH} deep", item.lineno, "does a module contain itself?"
            )
        for instance in item.instances:
            if isinstance(module, tree.Primitive):
                if item.delay is not None or item.parameters:
                    self.report.note("delay passed over: gates have their own", item.lineno)
                for index, count in self._array(instance, scope):
                    values = [port.value for port in instance.ports]
                    self.primitives.append(
                        Primitive(module.name, module, scope, values, index, count, instance.lineno)
                    )
                continue
            if not instance.name:
                self.report.fail("an instance without a name", instance.lineno, "name it")
            given = self._overrides(item, module, scope)
            for index, count in self._array(instance, scope):
                name = instance.name
                if instance.array is not None:
                    ends = [
                        constant(self.declarer.env(scope), b, "the range of an instance array")
                        for b in instance.array
                    ]
                    name = element(name, ends[1] + index if ends[0] >= ends[1] else ends[1] - index)
                self._instance(instance, module, name, given, scope, defparams, depth, index, count)

    def _instance(
        self,
        instance: tree.Instance,
        module: tree.Module,
        name: str,
        given: dict[str, Constant | Real],
        scope: Scope,
        defparams: dict[tuple[str, ...], Any],
        depth: int,
        index: int,
        count: int,
    ) -> None:
        inner = self._open(scope, name, instance.lineno, "module", module.name)
        below = _below(defparams, name)
        mine = {path[0]: value for path, value in below.items() if len(path) == 1}
        self._used |= {id(value) for value in mine.values()}
        given = given | mine
        ports, _ = self._module(
            module, inner, given, {p: v for p, v in below.items() if len(p) > 1}, depth + 1
        )
        for port, value, at in self._matched(instance, module, ports, scope):
            self.connections.append(Connection(port, inner, scope, value, index, count, at))

    def _overrides(
        self, item: tree.Instances, module: tree.Module, scope: Scope
    ) -> dict[str, Constant | Real]:
        given: dict[str, Constant | Real] = {}
        sources = item.parameters
        if item.delay is not None:
            sources = [
                tree.PortArgument(None, vast.IntConst(item.delay, lineno=item.lineno), False, item.lineno)
            ]
        names = [n.name for p in module.parameters if not p.local for n in p.names]
        if not module.parameters:
            names = [
                n.name
                for p in _flat(module.items)
                if isinstance(p, tree.Parameters) and not p.local
                for n in p.names
            ]
        if len(sources) == 1 and sources[0].name is None and sources[0].value is None:
            return {}
        by_name = {source.name is not None for source in sources}
        if len(by_name) > 1:
            self.report.fail("parameters by name and by position mixed", item.lineno, "use one of both ways")
        for i, source in enumerate(sources):
            name = source.name
            if name is None:
                if i >= len(names):
                    self.report.fail(
                        f"{printable(module.name)} has {len(names)} parameters",
                        source.lineno or item.lineno,
                        "give at most as many",
                    )
                name = names[i]
            elif name not in names:
                known = ", ".join(map(printable, names)) or "none"
                what = f"{printable(module.name)} has no parameter {printable(name)}"
                self.report.fail(what, source.lineno, f"it has: {known}")
            if name in given:
                self.report.fail(f"parameter {printable(name)} is given twice", source.lineno, "give it once")
            if source.value is not None:
                given[name] = run(
                    Sizer(self.declarer.env(scope)).constant(source.value, f"parameter {printable(name)}")
                )
        return given

    def _matched(
        self, instance: tree.Instance, module: tree.Module, ports: list[Net], scope: Scope
    ) -> list[tuple[Net, tree.Node, int]]:
        """Ports with what stands at them; those left open are left out."""
        out: list[tuple[Net, tree.Node, int]] = []
        shown = printable(module.name)
        by_name = [p for p in instance.ports if p.name is not None]
        if by_name and len(by_name) != len(instance.ports):
            self.report.fail("ports by name and by position mixed", instance.lineno, "use one of both ways")
        if not by_name:
            if len(instance.ports) > len(ports):
                self.report.fail(
                    f"{shown} has {len(ports)} ports, not {len(instance.ports)}",
                    instance.lineno,
                    "connect as many, or connect by name",
                )
            return [
                (port, given.value, given.lineno or instance.lineno)
                for port, given in zip(ports, instance.ports, strict=False)
                if given.value is not None
            ]
        known = {item.name.name: port for item, port in zip(module.ports, ports, strict=True)}
        seen: set[str] = set()
        for given in by_name:
            name = given.name or ""
            if name == "*":
                continue
            if name not in known:
                listed = ", ".join(map(printable, known))
                self.report.fail(f"{shown} has no port {printable(name)}", given.lineno, f"it has: {listed}")
            if name in seen:
                self.report.fail(
                    f"port {printable(name)} is connected twice", given.lineno, "connect it once"
                )
            seen.add(name)
            value = vast.Identifier(name, lineno=given.lineno) if given.shorthand else given.value
            if value is not None:
                out.append((known[name], value, given.lineno))
        star = [given for given in by_name if given.name == "*"]
        if star:
            for name, port in known.items():
                if name not in seen:
                    # .* connects names that exist, and nothing comes into being by it (1800-2017 23.3.2.4).
                    if scope.find(name) is None:
                        self.report.fail(
                            f".* finds no {printable(name)} here", star[0].lineno, f"connect .{name}(…)"
                        )
                    out.append((port, vast.Identifier(name, lineno=star[0].lineno), star[0].lineno))
        return out

    # -- implicit nets -------------------------------------------------------------------------------------

    def _implicit_nets(self) -> None:
        """Names that only a port, a gate or the left of an assign uses are scalar nets (clause 4.5)."""
        for scope, left, _, _ in self.assigns:
            self._imply(scope, left)
        for connection in self.connections:
            self._imply(connection.outer, connection.value)
        for primitive in self.primitives:
            for terminal in primitive.terminals:
                self._imply(primitive.scope, terminal)

    def _imply(self, scope: Scope, node: Any) -> None:
        stack = [node]
        while stack:
            part = stack.pop()
            if isinstance(part, vast.Identifier):
                if part.scope is None and scope.find(part.name) is None:
                    name = printable(part.name)
                    if self.report.source.net_type(part.lineno) != "wire":
                        self.report.fail(
                            f"{name} isn't declared, and `default_nettype is none",
                            part,
                            f"declare wire {name}",
                        )
                    self.report.note(f"{name} isn't declared and becomes a wire of one bit", part)
                    named = tree.Named(part.name, [], None, part.lineno)
                    shape = self.declarer.shape(None, scope)
                    self.declarer.net(shape, named, scope)
            elif isinstance(part, vast.Concat):
                stack += reversed(part.list)
            elif isinstance(part, vast.UnaryOperator):
                stack.append(part.right)
            elif isinstance(part, vast.Operator) and not isinstance(part, vast.Cond):
                stack += (part.right, part.left)


def _flat(items: Iterable[Any]) -> Iterable[Any]:
    """The items with lists (of one statement's assigns, of a generate region) spread out, in order."""
    stack = [iter(items)]
    while stack:
        item = next(stack[-1], None)
        if item is None:
            stack.pop()
        elif isinstance(item, list):
            stack.append(iter(item))
        else:
            yield item


def _below(defparams: Mapping[tuple[str, ...], Any], name: str) -> dict[tuple[str, ...], Any]:
    return {path[1:]: value for path, value in defparams.items() if len(path) > 1 and path[0] == name}
