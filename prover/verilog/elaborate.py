"""Syntax tree to Design: the top module is found, laid flat, and what drives each net is worked out."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any, cast

from pyverilog.vparser import ast as vast

from prover import expr as e
from prover.design import Design, GateKind, Note
from prover.errors import UserError
from prover.expr import Expr
from prover.verilog import tree
from prover.verilog.declare import Declarer
from prover.verilog.deep import run
from prover.verilog.drivers import Drivers
from prover.verilog.execute import Environment, Executor, State
from prover.verilog.hierarchy import Connection, Hierarchy, Primitive
from prover.verilog.names import Constant, Net, Real, Report, Scope, Type
from prover.verilog.parse import parse_chunk, read_chunks
from prover.verilog.parts import Place
from prover.verilog.processes import Driver, Processes
from prover.verilog.sizing import Sizer, Value
from prover.verilog.source import Source, printable
from prover.verilog.words import cut


@dataclass(slots=True)
class Library:
    """The modules of a source, parsed when first asked for."""

    source: Source
    report: Report
    chunks: dict[str, Any] = field(default_factory=dict)
    parsed: dict[str, tree.Module | tree.Primitive] = field(default_factory=dict)

    @classmethod
    def of(cls, source: Source) -> Library:
        report = Report(source)
        for message, where in source.notes:
            report.notes[message, where] = Note(message, where)
        library = cls(source, report)
        remarks: list[tuple[str, int]] = []
        for chunk in read_chunks(source, remarks):
            if chunk.name in library.chunks:
                other = source.where(library.chunks[chunk.name].offset)
                report.fail(
                    f"module {printable(chunk.name)} is defined twice: here and at {other}",
                    chunk.offset,
                    "rename or remove one of them",
                )
            library.chunks[chunk.name] = chunk
        for message, at in remarks:
            report.note(message, at)
        return library

    def get(self, name: str) -> tree.Module | tree.Primitive | None:
        """The module or primitive of that name, or None; UserError if it isn't Verilog."""
        if name not in self.parsed and name in self.chunks:
            self.parsed[name] = parse_chunk(self.source, self.chunks[name])
        return self.parsed.get(name)

    def top(self, named: str | None) -> tree.Module:
        """The module asked for, or the only one with ports that no other one contains."""
        listed = ", ".join(printable(name) for name in self.chunks)
        if named is not None:
            found = self.get(named)
            if not isinstance(found, tree.Module):
                what = f"module {printable(named)} isn't defined"
                raise UserError(
                    what, self._anywhere(), f"there are: {listed}" if listed else "is this Verilog?"
                )
            return found
        modules = {n: self.get(n) for n, chunk in self.chunks.items() if not chunk.portless}
        inside = {
            user for module in modules.values() if isinstance(module, tree.Module) for user in users(module)
        }
        tops = [m for n, m in modules.items() if isinstance(m, tree.Module) and n not in inside]
        for chunk in self.chunks.values():
            if chunk.portless and tops:
                self.report.note(
                    f"{printable(chunk.name)} has no ports and is left aside as a test bench", chunk.offset
                )
        if not tops:
            raise UserError("no module with ports that could be the top", self._anywhere(),
                            f"name it with --module: {listed}" if listed else "is this Verilog?")  # fmt: skip
        if len(tops) > 1:
            names = ", ".join(printable(m.name) for m in tops)
            self.report.fail(
                f"which module is the top isn't plain: {names}", tops[1].lineno, "choose one with --module"
            )
        return tops[0]

    def _anywhere(self) -> Any:
        return self.source.where(0)


def users(module: tree.Module) -> set[str]:
    """Names of the modules that the module may contain, in any branch of its generate constructs."""
    found: set[str] = set()
    stack: list[Any] = list(module.items)
    while stack:
        item = stack.pop()
        if isinstance(item, list):
            stack += item
        elif isinstance(item, tree.Instances):
            found.add(item.module)
        elif isinstance(item, tree.GenerateBlock):
            stack += item.items
        elif isinstance(item, tree.GenerateIf):
            stack += [item.then, item.other]
        elif isinstance(item, tree.GenerateFor):
            stack.append(item.body)
        elif isinstance(item, tree.GenerateCase):
            stack += [body for _, body in item.arms]
    return found - {module.name}


def elaborate(source: Source, module: str | None, parameters: Mapping[str, int]) -> Design:
    """The Design of a source; `module` names the top and `parameters` override its parameters."""
    library = Library.of(source)
    top = library.top(module)
    return Elaboration(library, top).run(parameters)


class Elaboration:
    """One reading: the parts that do the work, and the drivers that they find."""

    def __init__(self, library: Library, top: tree.Module) -> None:
        self.library, self.top, self.report = library, top, library.report
        self.executor = Executor(self.report)
        self.declarer = Declarer(self.report, self.executor)
        self.executor.declares = self.declarer
        self.hierarchy = Hierarchy(self.report, library.get, self.executor, self.declarer)
        self.processes = Processes(self.report, self.executor)

    def run(self, parameters: Mapping[str, int]) -> Design:
        given = {
            name: Constant(value & ((1 << width) - 1), 0, 0, Type(width, True), sized=False)
            for name, value in parameters.items()
            for width in (max(32, value.bit_length() + 1),)
        }
        scope, ports, names = self.hierarchy.elaborate(self.top, given)
        nets = self.declarer.nets
        self.drivers = Drivers(self.report, nets, [], [])
        self._continuous()
        self._primitives()
        self._processes()
        self._connections()
        self._initial()
        driven = self.drivers.by_net
        for port in ports:
            inward = port.direction == "input" or (port.direction == "inout" and port not in driven)
            (self.drivers.inputs if inward else self.drivers.outputs).append(port)
        registers, signals = self.drivers.resolve()
        design = Design(
            top=self.top.name,
            inputs={net.name: net.width for net in self.drivers.inputs},
            outputs=tuple(net.name for net in self.drivers.outputs),
            registers=tuple(registers),
            signals=signals,
            parameters=self._parameters(scope, names),
            files=self.library.source.files,
            sha256=self.library.source.sha256,
            notes=tuple(self.report.notes.values()),
            gates=self.drivers.gates,
        )
        design.sanity_check()
        return design

    def _parameters(self, scope: Scope, names: list[str]) -> dict[str, int]:
        out: dict[str, int] = {}
        for name in names:
            try:
                value = scope.names[name].get(self.report, name)
            except UserError:
                # What can't be read and nothing used; a use would have been refused before.
                continue
            if not isinstance(value, Real):
                out[name] = value.number
            elif value.value.is_integer():
                out[name] = int(value.value)
        return out

    # -- drivers of nets -----------------------------------------------------------------------------------

    def drive(
        self,
        places: list[Place],
        value: Expr,
        at: int,
        gate: tuple[GateKind, tuple[Expr, ...]] | None = None,
    ) -> None:
        """A continuous driver for the places, the uppermost bits for the first."""
        high = value.width
        for place in places:
            net = place.net
            assert isinstance(net, Net)
            part = cut(value, high - 1, high - place.width)
            high -= place.width
            if not isinstance(place.low, int) or isinstance(place.word, Expr):
                self.report.fail(
                    "a continuous assignment to a bit that changes isn't supported", at, "use an always block"
                )
            if net.kind == "variable":
                name = printable(net.name)
                what = f"{name} is a reg and can't be driven from outside a process"
                self.report.fail(what, at, f"declare {name} as wire")
            low = place.low + (place.word or 0) * net.type.width
            word = part
            if low:
                word = e.concat(word, e.const(0, low))
            word = e.resize(word, net.width, False)
            self.drivers.add(Driver(net, ((1 << place.width) - 1) << low, at, word, gate=gate))

    def _continuous(self) -> None:
        for scope, left, right, at in self.hierarchy.assigns:
            env = Environment(self.executor, scope, State())
            places: list[Place] = run(self.executor.targets(left, env))
            value = run(Sizer(env).assigned(right, sum(p.width for p in places)))
            self.drive(places, value, at)

    def _primitives(self) -> None:
        for primitive in self.hierarchy.primitives:
            if primitive.table is not None:
                from prover.verilog.udp import udp_driver

                udp_driver(self, primitive)
            else:
                self._gate(primitive)

    def terminals(self, primitive: Primitive, outputs: int) -> tuple[list[list[Place]], list[Expr]]:
        """Output places and input bits of a primitive; the inputs follow the outputs."""
        env = Environment(self.executor, primitive.scope, State())
        places = []
        for node in primitive.terminals[:outputs]:
            found: list[Place] = run(self.executor.targets(node, env))
            places.append(self._element(found, primitive.index, primitive.count, node))
        bits = []
        for node in primitive.terminals[outputs:]:
            value: Value = run(Sizer(env).alone(node))
            word = value.word
            if word.width == primitive.count and primitive.count > 1:
                word = cut(word, primitive.index, primitive.index)
            if word.width != 1:
                self.report.fail(f"a terminal of {word.width} bits on a gate", node, "connect one bit")
            bits.append(word)
        return places, bits

    def _element(self, places: list[Place], index: int, count: int, node: Any) -> list[Place]:
        """The bit of an output that belongs to one instance of an array."""
        total = sum(place.width for place in places)
        if total == 1 and count == 1:
            return places
        if total != count or len(places) != 1 or not isinstance(places[0].low, int):
            self.report.fail(f"an output of {total} bits on {count} gate(s)", node, "connect one bit to each")
        place = places[0]
        assert isinstance(place.low, int)
        return [Place(place.net, place.word, place.low + index, 1, False)]

    def _gate(self, gate: Primitive) -> None:
        kind = gate.kind
        tri_state = kind.startswith(("bufif", "notif"))
        outputs = len(gate.terminals) - 1 if kind in ("buf", "not") else 1
        inputs = len(gate.terminals) - outputs
        if outputs < 1 or inputs < 1 or (tri_state and inputs != 2):
            self.report.fail(
                f"a {kind} gate with {len(gate.terminals)} terminals",
                gate.at,
                "a gate has its outputs first, then its inputs",
            )
        places, bits = self.terminals(gate, outputs)
        if tri_state:
            control = bits[1] if kind.endswith("1") else e.bvnot(bits[1])
            data = e.bvnot(bits[0]) if kind.startswith("notif") else bits[0]
            value = e.ite(control, data, self.report.choice(1))
            self.report.note("a floating output counts as any value", gate.at)
        else:
            value = _joined(kind, bits)
        as_written = None if tri_state else (cast(GateKind, kind), tuple(bits))
        for place in places:
            self.drive(place, value, gate.at, as_written)

    def _processes(self) -> None:
        for scope, node in self.hierarchy.processes:
            for driver in self.processes.always(scope, node):
                self.drivers.add(driver)

    # -- ports ---------------------------------------------------------------------------------------------

    def _connections(self) -> None:
        """Ports, those that go both ways last and from the inside out: by then it shows which way they go."""
        both_ways = [c for c in self.hierarchy.connections if c.port.direction == "inout"]
        for connection in self.hierarchy.connections:
            if connection.port.direction != "inout":
                self._connect(connection, outward=connection.port.direction == "output")
        for connection in sorted(both_ways, key=lambda c: -c.port.name.count(".")):
            self._connect(connection, outward=connection.port in self.drivers.by_net)

    def _connect(self, connection: Connection, outward: bool) -> None:
        port, at, count = connection.port, connection.at, connection.count
        env = Environment(self.executor, connection.outer, State())
        if outward:
            places: list[Place] = run(self.executor.targets(connection.value, env))
            total = sum(place.width for place in places)
            value = port.value
            if (
                count > 1
                and total == count * port.width
                and len(places) == 1
                and isinstance(places[0].low, int)
            ):
                place = places[0]
                low = places[0].low + connection.index * port.width
                places, total = [Place(place.net, place.word, low, port.width, False)], port.width
            elif count > 1 and total != port.width:
                self.report.fail(
                    f"{total} bits on {count} ports of {port.width}",
                    at,
                    "give one bit for each, or the same for all",
                )
            self._remark_width(port, total, at)
            self.drive(places, e.resize(value, total, port.type.signed), at)
            return
        own: Type = run(Sizer(env).type_of(connection.value))
        if count > 1 and own.width == count * port.width:
            value = run(Sizer(env).alone(connection.value)).word
            low = connection.index * port.width
            value = cut(value, low + port.width - 1, low)
        else:
            if count > 1 and own.width != port.width:
                self.report.fail(
                    f"{own.width} bits on {count} ports of {port.width}",
                    at,
                    "give one bit for each, or the same for all",
                )
            if not isinstance(connection.value, vast.IntConst):
                self._remark_width(port, own.width, at)
            value = run(Sizer(env).assigned(connection.value, port.width))
        # An input is a net whatever it is declared as, so the driver is added as it is.
        self.drivers.add(Driver(port, (1 << port.width) - 1, at, value))

    def _remark_width(self, port: Net, width: int, at: int) -> None:
        if width != port.width:
            what = "cut" if (width > port.width) != (port.direction == "output") else "extended"
            self.report.note(
                f"port {printable(port.name)} has {port.width} bits and meets {width}: {what}", at
            )

    # -- initial values ------------------------------------------------------------------------------------

    def _initial(self) -> None:
        for scope, net, node in self.declarer.initial:
            env = Environment(self.executor, scope, State())
            value = run(Sizer(env).assigned(node, net.width))
            mask, bits = self.processes.known_bits(
                value, e.const(-1, net.width), (1 << net.width) - 1, net.offset
            )
            self.drivers.add_initial(net, mask, bits, net.offset)
        declared = dict(self.drivers.initial)
        for scope, statement in self.hierarchy.initials:
            for net, (mask, bits) in self.processes.initial(scope, statement).items():
                if net in declared:
                    # A declaration's value comes first in time, so an initial block has the last word.
                    before, old = self.drivers.initial.pop(net)
                    self.drivers.initial[net] = (before & ~mask, old & ~mask)
                self.drivers.add_initial(net, mask, bits, statement.lineno)
        for net in list(self.drivers.initial):
            wires = [d for d in self.drivers.by_net.get(net, []) if d.word is not None]
            if wires:
                self.report.note(
                    f"{printable(net.name)} is driven all the time; its initial value has no say", net.offset
                )
                del self.drivers.initial[net]


def _joined(kind: str, bits: list[Expr]) -> Expr:
    """A gate's output (clause 7.2 and 7.3)."""
    value = bits[0]
    for bit in bits[1:]:
        if kind in ("and", "nand"):
            value = e.bvand(value, bit)
        elif kind in ("or", "nor"):
            value = e.bvor(value, bit)
        else:
            value = e.bvxor(value, bit)
    return e.bvnot(value) if kind in ("nand", "nor", "xnor", "not") else value
