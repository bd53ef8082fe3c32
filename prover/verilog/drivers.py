"""Drivers to a Design: who drives which bit, wires written out, loops cut, registers named.

Every net is cut where its driver changes; a slice is one wire or one register. Wires are then replaced by
what drives them, operands first. Wires in a circle can't be; the slices of a circle are first cut to single
bits, because most circles are none bit by bit, and of a true one some are kept as `loop` registers that are
forced to their driver all the time. What hangs on gate primitives is written out a second time, up to the nets that
they drive: there no gate is simplified away.
"""

from __future__ import annotations

from collections import deque
from collections.abc import Iterable
from dataclasses import dataclass, field, replace
from typing import Literal

from prover import expr as e
from prover.design import Edge, Force, Gate, GateKind, Register, Signal
from prover.errors import Where
from prover.expr import Expr
from prover.verilog.names import Net, Report
from prover.verilog.processes import Driver
from prover.verilog.source import printable
from prover.verilog.words import Replacer, Search, cut, joined, reads, runs

UNDRIVEN = "?undriven "
# Wider vectors aren't looked at bit by bit for circles, and more circles than this are no divider.
MAX_SPLIT = 256
MAX_LOOPS = 64


@dataclass(slots=True, eq=False)
class Slice:
    """Bits high..low of a net with one driver; `known` are the bits with an initial value."""

    net: Net
    high: int
    low: int
    driver: Driver | None
    name: str
    initial: int | None
    word: Expr | None = None

    @property
    def width(self) -> int:
        return self.high - self.low + 1

    @property
    def gate(self) -> tuple[GateKind, tuple[Expr, ...]] | None:
        """The gate that drives it, with its input bits."""
        return self.driver.gate if self.driver is not None else None


@dataclass(slots=True)
class Drivers:
    """Collects drivers, then resolves them."""

    report: Report
    nets: list[Net]
    inputs: list[Net]
    outputs: list[Net]
    by_net: dict[Net, list[Driver]] = field(default_factory=dict)
    initial: dict[Net, tuple[int, int]] = field(default_factory=dict)
    slices: dict[Net, list[Slice]] = field(default_factory=dict)
    named: dict[str, Slice] = field(default_factory=dict)
    whole: dict[Expr, Expr] = field(default_factory=dict)
    cuts: dict[tuple[Expr, int, int], Expr] = field(default_factory=dict)
    expand: Replacer = field(default_factory=lambda: Replacer({}))
    final: Replacer = field(default_factory=lambda: Replacer({}))
    written: Replacer = field(default_factory=lambda: Replacer({}))
    gates: dict[str, Gate] = field(default_factory=dict)
    searches: dict[tuple[Expr, int], Search] = field(default_factory=dict)

    def add(self, driver: Driver) -> None:
        self.by_net.setdefault(driver.net, []).append(driver)

    def add_initial(self, net: Net, mask: int, value: int, at: int) -> None:
        """Initial values of some bits; two that differ are refused, because their order is open."""
        if net.kind == "net":
            self.report.fail(
                f"{printable(net.name)} is a wire and has no initial value", at, "drive it with assign"
            )
        before, old = self.initial.get(net, (0, 0))
        if (old ^ value) & before & mask:
            self.report.fail(
                f"{printable(net.name)} has two different initial values", at, "keep one of them"
            )
        self.initial[net] = (before | mask, old | (value & mask & ~before))

    def resolve(self) -> tuple[list[Register], dict[str, Signal]]:
        """Registers and signals, in order of declaration. Raises UserError for two drivers of a bit, for what
        is read and not driven, and for data that its own clock edge makes."""
        self._drop_temporaries()
        for net in self.nets:
            self._check_single(net)
        self._remark_races()
        split: set[Net] = set()
        while True:
            self._cut_up(split)
            circles = self._circles()
            more = {self.named[name].net for circle in circles for name in circle} - split
            more = {net for net in more if 1 < net.width <= MAX_SPLIT}
            if not more:
                break
            split |= more
        loops = {name for circle in circles for name in self._kept(circle)}
        values, self.final = self._write_out(loops)
        gated = {name for name, part in self.named.items() if part.gate is not None}
        to_gates, self.written = self._write_out(loops | gated) if gated else (values, self.final)
        self.gates = {name: self._gate(self.named[name]) for name in self.named if name in gated}
        return self._registers(values, loops), self._signals(values, to_gates)

    # -- who drives what -----------------------------------------------------------------------------------

    def _drop_temporaries(self) -> None:
        """Leave out variables that a block only uses for itself: loop counters, values in between."""
        readers: dict[str, set[Net]] = {}
        for net, drivers in self.by_net.items():
            for driver in drivers:
                for name in reads(_words(driver)):
                    readers.setdefault(name, set()).add(net)
        ports = {*self.inputs, *self.outputs}
        for net in list(self.nets):
            drivers = self.by_net.get(net, [])
            private = net.kind != "net" and net.direction is None and net not in ports
            if not private or readers.get(net.name, set()) - {net}:
                continue
            wire = len(drivers) == 1 and drivers[0].word is not None
            passing = drivers and not wire and all(d.procedural and not d.keeps_itself for d in drivers)
            if passing or (not drivers and net in self.initial):
                self.by_net.pop(net, None)
                self.nets.remove(net)

    def _remark_races(self) -> None:
        """Note registers assigned with = that another block samples at the same edge."""
        racy = {
            (net.name, edge.clock): net
            for net, drivers in self.by_net.items()
            for driver in drivers
            for edge in driver.edges
            if driver.procedural
        }
        if not racy:
            return
        names = {name for name, _ in racy}
        for drivers in self.by_net.values():
            for driver in drivers:
                for edge in driver.edges:
                    for name in names & reads([edge.data]).keys():
                        source = racy.get((name, edge.clock))
                        if source is not None and not self._same_block(source, driver):
                            self.report.note(
                                f"{printable(name)} is assigned with = and read at the same edge by another "
                                "block: a simulator may take either value, gates take the old one",
                                driver.at,
                            )

    def _same_block(self, source: Net, driver: Driver) -> bool:
        return any(other.block == driver.block for other in self.by_net[source])

    def _check_single(self, net: Net) -> None:
        drivers = self.by_net.get(net, [])
        for driver in drivers:
            if driver.error is not None:
                raise driver.error
        if net in self.inputs and drivers:
            self.report.fail(
                f"{printable(net.name)} is an input and can't be driven here",
                drivers[0].at,
                "make it an output, or drive another net",
            )
        taken: list[Driver] = []
        for driver in sorted(drivers, key=lambda d: d.at):
            for other in taken:
                both = driver.mask & other.mask
                if both:
                    high, low = next(runs(both))
                    procedural = not (driver.word is not None and not driver.procedural)
                    what = (
                        "assigned in two always blocks"
                        if procedural and self._is_block(other)
                        else "driven twice"
                    )
                    place = self.report.where(other.at)
                    self.report.fail(
                        f"{printable(net.part(high, low))} is {what}: here and at {place}",
                        driver.at,
                        "leave one driver",
                    )
            taken.append(driver)

    @staticmethod
    def _is_block(driver: Driver) -> bool:
        return driver.procedural or driver.word is None

    def _cut_up(self, split: set[Net]) -> None:
        """Slices of every net, and the nets' words as their slices joined."""
        self.slices, self.named, self.whole = {}, {}, {}
        for net in self.nets:
            parts = sorted(self._parts(net, split))
            made = [self._slice(net, high, low, driver) for low, high, driver in parts]
            self.slices[net] = made
            self.named.update({s.name: s for s in made})
            if len(made) > 1 or made[0].name != net.name:
                self.whole[net.value] = joined([e.var(s.name, s.width) for s in reversed(made)])
        self.expand, self.cuts = Replacer(self.whole), {}
        for net in self.nets:
            for part in self.slices[net]:
                if part.driver is not None and part.driver.word is not None:
                    part.word = self._sliced(part.driver.word, part)
                elif part.driver is None and net.words and part.initial is not None:
                    # A memory that only initial values fill is a table, not state.
                    part.word = e.const(part.initial, part.width)

    def _sliced(self, word: Expr, part: Slice) -> Expr:
        """A driver's word for one slice, in terms of slices."""
        return self.expand(cut(word, part.high, part.low, self.cuts))

    def _parts(self, net: Net, split: set[Net]) -> list[tuple[int, int, int]]:
        """(low, high, index of the driver or -1) for every slice of the net."""
        drivers = self.by_net.get(net, [])
        free = (1 << net.width) - 1
        masks = [(i, d.mask) for i, d in enumerate(drivers)]
        free &= ~sum(d.mask for d in drivers)
        if free:
            masks.append((-1, free))
        known, _ = self.initial.get(net, (0, 0))
        parts = []
        for index, mask in masks:
            stores = index < 0 or drivers[index].word is None
            for piece in (mask & known, mask & ~known) if stores and known else (mask,):
                for high, low in runs(piece):
                    step = net.type.width if net.words else net.width
                    step = 1 if net in split and index >= 0 and drivers[index].word is not None else step
                    start = low
                    while start <= high:
                        end = min(high, start - start % step + step - 1)
                        parts.append((start, end, index))
                        start = end + 1
        return parts

    def _slice(self, net: Net, high: int, low: int, index: int) -> Slice:
        driver = self.by_net[net][index] if index >= 0 else None
        known, value = self.initial.get(net, (0, 0))
        initial = None
        mask = (1 << (high - low + 1)) - 1
        if known >> low & mask:
            initial = value >> low & mask
        return Slice(net, high, low, driver, net.part(high, low), initial)

    # -- circles of wires ----------------------------------------------------------------------------------

    def _edges(self) -> dict[str, list[str]]:
        """For each wire slice the wire slices that its driver reads."""
        wires = {name: part for name, part in self.named.items() if part.word is not None}
        return {
            name: [other for other in reads([part.word]) if other in wires]
            for name, part in wires.items()
            if part.word is not None
        }

    def _circles(self) -> list[list[str]]:
        return strongly_connected(self._edges())

    def _kept(self, circle: list[str]) -> list[str]:
        """Slices whose removal leaves no circle: the busiest first, until none is left."""
        edges = self._edges()
        rank = {name: i for i, name in enumerate(self.named)}
        # A wire that reads itself is a circle by itself.
        kept = sorted((name for name in circle if name in edges[name]), key=rank.__getitem__)
        rest = set(circle) - set(kept)
        pending = strongly_connected({name: [o for o in edges[name] if o in rest] for name in sorted(rest)})
        for name in kept:
            self._remark_loop([name, name])
        while pending:
            inside = set(pending.pop())
            inner = {name: [other for other in edges[name] if other in inside] for name in sorted(inside)}
            into = dict.fromkeys(inner, 0)
            for others in inner.values():
                for other in others:
                    into[other] += 1
            choice = max(inner, key=lambda name: (into[name] * len(inner[name]), -rank[name]))
            kept.append(choice)
            if len(kept) > MAX_LOOPS:
                driver = self.named[choice].driver
                self.report.fail(
                    "too many combinational loops", driver.at if driver else 0, "cut them with registers"
                )
            self._remark_loop(_round(inner, choice))
            del inner[choice]
            rest_edges = {name: [o for o in others if o != choice] for name, others in inner.items()}
            pending += strongly_connected(rest_edges)
        return kept

    def _remark_loop(self, path: list[str]) -> None:
        driver = self.named[path[0]].driver
        assert driver is not None
        self.report.note("combinational loop: " + " -> ".join(map(printable, path)), driver.at)

    def _write_out(self, kept: set[str]) -> tuple[dict[str, Expr], Replacer]:
        """For each slice its value over registers, inputs and the slices that are kept, and what replaces them."""
        values: dict[str, Expr] = {}
        edges = self._edges()
        final = Replacer({})
        for name, part in self.named.items():
            if part.word is not None and name not in kept:
                continue
            driven = part.driver is not None or part.net in self.inputs or part.initial is not None
            values[name] = e.var(name if driven else UNDRIVEN + name, part.width)
            final.memo[e.var(name, part.width)] = values[name]
        for name in _operands_first(
            {n: [o for o in os if o not in kept] for n, os in edges.items() if n not in kept}
        ):
            part = self.named[name]
            assert part.word is not None
            values[name] = final(part.word)
            final.memo[e.var(name, part.width)] = values[name]
        return values, final

    def _gate(self, part: Slice) -> Gate:
        """The gate that drives a slice, as written."""
        assert part.driver is not None
        assert part.driver.gate is not None
        kind, bits = part.driver.gate
        return Gate(
            kind, tuple(self.written(self.expand(bit)) for bit in bits), self.report.where(part.driver.at)
        )

    def _as_written(self, word: Expr, value: Expr) -> Expr | None:
        """A word of slices over the nets of gates; None if that is its value."""
        made = self.written(word)
        return None if made is value else made

    # -- results -------------------------------------------------------------------------------------------

    def _registers(self, values: dict[str, Expr], loops: set[str]) -> list[Register]:
        out: list[Register] = []
        for part in self.named.values():
            if part.net in self.inputs or (part.word is not None and part.name not in loops):
                continue
            if part.driver is None and part.initial is None:
                continue
            where = self.report.where(part.net.offset)
            if part.name in loops:
                assert part.word is not None
                assert part.driver is not None
                value = self.final(part.word)
                place = self.report.where(part.driver.at)
                force = Force(e.TRUE, value, place, self._as_written(part.word, value))
                out.append(Register(part.name, part.width, "loop", (), (force,), part.initial, where))
            else:
                out.append(self._stored(part))
        self._check_read(out, values)
        return out

    def _stored(self, part: Slice) -> Register:
        driver = part.driver
        edges: list[Edge] = []
        forces: list[Force] = []
        for edge in driver.edges if driver else ():
            clock, data = (self.final(x) for x in (self.expand(edge.clock), self._sliced(edge.data, part)))
            self._check_race(part, clock, data)
            if clock.is_const:
                self.report.note(f"the clock of {printable(part.name)} never moves", part.net.offset)
            else:
                edges.append(Edge(clock, data))
        for force in driver.forces if driver else ():
            sliced = self._sliced(force.value, part)
            when, value = self.final(self.expand(force.when)), self.final(sliced)
            if when is not e.FALSE:
                written = self._as_written(sliced, value)
                forces.append(replace(force, when=when, value=value, written=written))
        where = self.report.where(driver.at if driver else part.net.offset)
        if driver and driver.latch:
            self.report.note(f"{printable(part.name)} is a latch: not every path assigns it", driver.at)
        kind: Literal["latch", "flip-flop"] = "latch" if driver and driver.latch else "flip-flop"
        primitive = bool(driver and not driver.block)
        return Register(
            part.name, part.width, kind, tuple(edges), tuple(forces), part.initial, where, primitive
        )

    def _check_race(self, part: Slice, clock: Expr, data: Expr) -> None:
        """A clock that is plainly a signal must not be its own register's data (the value would race)."""
        signal = clock.args[0] if clock.op == "bvnot" else clock
        variable = signal.args[0] if signal.op == "extract" else signal
        # A primitive's table says itself what an edge of any of its inputs does.
        primitive = part.driver is not None and not part.driver.block
        if variable.op != "var" or variable.name == part.name or primitive:
            return
        mask = reads([signal]).get(variable.name, 0)
        search = self.searches.setdefault((variable, mask), Search(variable, mask))
        if search.reads(data):
            assert part.driver is not None
            self.report.fail(
                f"{printable(part.name)} samples {printable(variable.name)}, which is the signal that "
                "clocks it: a simulator reads its new value, gates race",
                part.driver.at,
                "sample something else, or use the other edge",
            )

    def _check_read(self, registers: Iterable[Register], values: dict[str, Expr]) -> None:
        """Refuse what hangs on a net that nothing drives."""
        roots: list[Expr] = []
        for register in registers:
            roots += [x for edge in register.edges for x in (edge.clock, edge.data)]
            roots += [x for force in register.forces for x in (force.when, force.value)]
        for net in self.outputs:
            roots += [values[part.name] for part in self.slices[net]]
        for node in e.variables(roots):
            if node.name.startswith(UNDRIVEN):
                name = node.name.removeprefix(UNDRIVEN)
                part = self.named[name]
                never = "never driven" if part.net.kind == "net" else "never assigned"
                reading = "floats" if part.net.kind == "net" else "stays x"
                self.report.fail(f"{printable(name)} is {never}, so that it {reading}", part.net.offset,
                                 f"drive {printable(name)}, or connect it")  # fmt: skip

    def _driven(self, part: Slice) -> Where | None:
        """Where a slice is driven: by more than the name of another net, if that is driven at all."""
        seen: set[str] = set()
        while part.word is not None and part.name not in seen:
            seen.add(part.name)
            names = [v.name for v in e.variables([part.word])]
            further = self.named.get(names[0]) if _is_net(part.word) else None
            if further is None or further.driver is None:
                break
            part = further
        return self.report.where(part.driver.at) if part.driver is not None else None

    def _signals(self, values: dict[str, Expr], to_gates: dict[str, Expr]) -> dict[str, Signal]:
        out: dict[str, Signal] = {}
        for net in self.nets:
            parts = [values[part.name] for part in reversed(self.slices[net])]
            if all(part.op == "var" and part.name.startswith(UNDRIVEN) for part in parts):
                # Nothing reads it, or it would have been refused: it has no value to show.
                continue
            word = joined(parts)
            written = word
            if self.gates:
                written = joined([to_gates[part.name] for part in reversed(self.slices[net])])
            driven = self._driven(self.slices[net][0])
            where = self.report.where(net.offset)
            size = net.type.width
            for k in range(net.count):
                name = net.part(k * size + size - 1, k * size)
                value = cut(word, k * size + size - 1, k * size, self.cuts)
                to_nets = value if written is word else cut(written, k * size + size - 1, k * size, self.cuts)
                as_written = None if to_nets is value else to_nets
                out[name] = Signal(name, value, net.msb, net.lsb, net.type.signed, where, as_written, driven)
        return out


def _is_net(word: Expr) -> bool:
    return word.op == "var" or (word.op == "extract" and word.args[0].op == "var")


def _words(driver: Driver) -> list[Expr]:
    words = [] if driver.word is None else [driver.word]
    words += [word for edge in driver.edges for word in (edge.clock, edge.data)]
    return words + [word for force in driver.forces for word in (force.when, force.value)]


def strongly_connected(edges: dict[str, list[str]]) -> list[list[str]]:
    """The circles of a graph: its strongly connected parts of more than one node or with an edge to itself.

    Tarjan 1972, on an explicit stack.
    """
    index: dict[str, int] = {}
    low: dict[str, int] = {}
    on: set[str] = set()
    path: list[str] = []
    found: list[list[str]] = []
    for root in edges:
        if root in index:
            continue
        work = [(root, iter(edges[root]))]
        index[root] = low[root] = len(index)
        path.append(root)
        on.add(root)
        while work:
            node, rest = work[-1]
            following = next(rest, None)
            if following is None:
                work.pop()
                if work:
                    low[work[-1][0]] = min(low[work[-1][0]], low[node])
                if low[node] == index[node]:
                    part = []
                    while True:
                        part.append(path.pop())
                        on.discard(part[-1])
                        if part[-1] == node:
                            break
                    if len(part) > 1 or node in edges[node]:
                        found.append(part[::-1])
            elif following not in index:
                index[following] = low[following] = len(index)
                path.append(following)
                on.add(following)
                work.append((following, iter(edges[following])))
            elif following in on:
                low[node] = min(low[node], index[following])
    return found


def _operands_first(edges: dict[str, list[str]]) -> list[str]:
    """The nodes of a graph without circles, each after those it points to."""
    waits = {name: len(set(others)) for name, others in edges.items()}
    users: dict[str, list[str]] = {name: [] for name in edges}
    for name, others in edges.items():
        for other in set(others):
            users[other].append(name)
    ready = deque(name for name, count in waits.items() if not count)
    order: list[str] = []
    while ready:
        name = ready.popleft()
        order.append(name)
        for user in users[name]:
            waits[user] -= 1
            if not waits[user]:
                ready.append(user)
    return order


def _round(edges: dict[str, list[str]], start: str) -> list[str]:
    """A shortest way round from a node back to itself, in the direction of the signal."""
    before: dict[str, str] = {}
    queue = deque([start])
    while queue:
        name = queue.popleft()
        for other in edges[name]:
            if other == start:
                # The edges point from a wire to what it reads: followed backwards they run with the signal.
                path = [start, name]
                while path[-1] != start:
                    path.append(before[path[-1]])
                return path
            if other not in before:
                before[other] = name
                queue.append(other)
    return [start]
