"""Glitches shown: an order in which changes arrive at the output that makes it change more than once.

For a function that is an order of the bits that change. For gates it is an order in which the changes arrive at each
terminal: the same change takes its own time to each. Either is found on values and can be followed on them.
"""

from __future__ import annotations

import re
from collections import deque
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from itertools import pairwise
from typing import TYPE_CHECKING, Literal

from prover import expr as e
from prover.design import Design, element
from prover.errors import InternalError, Where
from prover.expr import Expr
from prover.hazard import Swing, clean, gate, still
from prover.reach import Reach
from prover.system import State
from prover.verilog.words import reads

if TYPE_CHECKING:
    from prover.rhythm import Orbit

MOST_ARRIVALS = 100_000
"""Situations on the way to the output that are looked through for an order that shows a pulse."""

MOST_TRIED = 12
"""Bits that change together up to which the shortest such order is looked for."""


@dataclass(frozen=True, slots=True)
class Arrival:
    """Something that changes on the way to the output.

    name        a bit of a register, the clock, or a gate's terminal with the net that it carries
    micro_step  0 for the clock's own edge; k for what its k-th reaction moves
    old, new    its values
    level       the output once it has arrived
    seen        what the output is made of, by name: words as they have arrived, and nets of gates
    """

    name: str
    micro_step: int
    old: int
    new: int
    level: int
    seen: Mapping[str, int]


@dataclass(frozen=True, slots=True)
class Glitch:
    """A half-cycle in which the output changes more than once.

    kind      "function": some order of the changes gives the pulse whatever gates are used; "gates": the gates as
              they are written do
    where     where the output is driven
    state     registers and clock before the edge, by name
    rising    whether the clock's edge is a rising one
    level     the output before the edge
    arrivals  what arrives at the output, in an order that shows the pulse
    orbit     the run from that state
    """

    kind: Literal["function", "gates"]
    where: Where
    state: Mapping[str, int]
    rising: bool
    level: int
    arrivals: tuple[Arrival, ...]
    orbit: Orbit

    @property
    def edge(self) -> str:
        """The clock's edge in words: rising or falling."""
        return "rising" if self.rising else "falling"

    @property
    def first(self) -> int:
        """The number of the arrival at which the output first changes."""
        return self._edges()[0]

    @property
    def back(self) -> int:
        """The number of the arrival at which it changes for the second time."""
        return self._edges()[1]

    @property
    def between(self) -> Mapping[str, int]:
        """What the output is made of, by name, when it first changes."""
        return self.arrivals[self.first].seen

    @property
    def changes(self) -> int:
        """How often the output changes in the half-cycle."""
        return len(self._edges())

    def _edges(self) -> list[int]:
        """The numbers of the arrivals at which the output changes."""
        levels = [self.level, *(arrival.level for arrival in self.arrivals)]
        return [i for i, (a, b) in enumerate(pairwise(levels)) if a != b]


class Replay:
    """A step from one state, on values: orders of arrival, and the output after each arrival."""

    def __init__(self, reach: Reach, state: State) -> None:
        self.reach, self.state = reach, state
        whole = reach.whole
        known = dict(zip(whole.names, state, strict=True))
        words = [moment[v.name] for moment in reach.moments for v in reach.inputs]
        known |= {v.name: 0 for v in e.variables(words) if v.name not in known}
        values = iter(e.evaluate(words, known))
        self.moments = [{v.name: next(values) for v in reach.inputs} for _ in reach.moments]
        self.output = e.compile_step([reach.output], [v.name for v in reach.inputs])

    def level(self, values: Mapping[str, int]) -> int:
        """The output, where its inputs have these values."""
        return self.output(*(values[v.name] for v in self.reach.inputs))[0]

    def moving(self, number: int) -> list[tuple[str, int]]:
        """The bits of the inputs that change in a micro-step, of those that the output reads."""
        then, now = self.moments[number : number + 2]
        return [
            (v.name, i)
            for v in self.reach.inputs
            for i in range(v.width)
            if ((then[v.name] ^ now[v.name]) & self.reach.read.get(v.name, 0)) >> i & 1
        ]

    def arrived(self, number: int, order: Sequence[tuple[str, int]]) -> list[Arrival]:
        """The bits of a micro-step in that order, with the output after each."""
        values = dict(self.moments[number])
        out = []
        for name, i in order:
            old = values[name] >> i & 1
            values[name] ^= 1 << i
            label = bit_name(self.reach.whole.design, name, i)
            out.append(Arrival(label, number, old, 1 - old, self.level(values), dict(values)))
        return out

    def by_function(self, model: Mapping[str, int]) -> list[Arrival]:
        """All arrivals, in each micro-step in an order that shows a pulse if there is one: a shortest one, or where
        many bits move the one that the model's masks say (early ones, late ones, the rest)."""
        out: list[Arrival] = []
        for number in range(len(self.moments) - 1):
            bits = self.moving(number)
            if len(bits) <= MOST_TRIED:
                order = self._shortest(number, bits)
            else:
                order = sorted(bits, key=lambda bit: _rank(model, number, *bit))
            out += self.arrived(number, order)
        return out

    def _shortest(self, number: int, bits: Sequence[tuple[str, int]]) -> list[tuple[str, int]]:
        """The bits in an order in which the output soon changes too often; as they are if there is none."""

        def values(arrived: int) -> dict[str, int]:
            out = dict(self.moments[number])
            for place, (name, i) in enumerate(bits):
                out[name] ^= (arrived >> place & 1) << i
            return out

        def onward(arrived: int) -> list[int]:
            return [place for place in range(len(bits)) if not arrived >> place & 1]

        whole = (1 << len(bits)) - 1
        wanted = 1 + (self.level(values(0)) ^ self.level(values(whole)))
        found = _way(0, onward, lambda arrived: self.level(values(arrived)), wanted) or []
        return [bits[place] for place in (*found, *(p for p in range(len(bits)) if p not in found))]

    def by_gates(self) -> list[Arrival] | None:
        """All arrivals, with those at each terminal of each gate in the micro-step in which the gates may pulse."""
        out: list[Arrival] = []
        shown = False
        for number in range(len(self.moments) - 1):
            if not shown and self.may_pulse(number):
                arrivals = _Terminals(self, number).arrivals()
                if arrivals is None:
                    return None
                out += arrivals
                shown = True
            else:
                out += self.arrived(number, self.moving(number))
        return out

    def swings(self, number: int) -> dict[str, Swing]:
        """What the inputs do in a micro-step, on values."""
        then, now = self.moments[number : number + 2]
        return {
            v.name: clean(e.const(then[v.name], v.width), e.const(now[v.name], v.width))
            for v in self.reach.inputs
        }

    def may_pulse(self, number: int) -> bool:
        return self.reach.network.as_written(self.swings(number)).hazard.value == 1

    def glitch(
        self, kind: Literal["function", "gates"], arrivals: Sequence[Arrival], orbit: Orbit, where: Where
    ) -> Glitch:
        """The arrivals as a glitch. Raises InternalError where they show none."""
        whole = self.reach.whole
        state = whole.describe(self.state)
        made = Glitch(
            kind=kind,
            where=where,
            state=state,
            rising=self.state[-1] == 0,
            level=self.level(self.moments[0]),
            arrivals=tuple(arrivals),
            orbit=orbit,
        )
        if made.changes < 2:
            raise InternalError("a glitch that does not replay")
        return made


def _rank(model: Mapping[str, int], number: int, name: str, bit: int) -> list[int]:
    masks = (model.get(f"!order{number}.{moment}.{name}", 0) for moment in ("early", "late"))
    return [1 - (mask >> bit & 1) for mask in masks]


def _way(
    begin: int, onward: Callable[[int], Sequence[int]], level: Callable[[int], int], wanted: int
) -> list[int] | None:
    """The shortest way, as places of bits to be inverted one after the other, on which the level changes so often;
    None if there is none, or none within so many as are looked through."""
    seen: dict[tuple[int, int], tuple[int, int, int] | None] = {(begin, 0): None}
    todo = deque([(begin, 0)])
    while todo and len(seen) < MOST_ARRIVALS:
        here = todo.popleft()
        if here[1] == wanted:
            way = []
            step = seen[here]
            while step is not None:
                way.append(step[2])
                step = seen[step[:2]]
            return way[::-1]
        for place in onward(here[0]):
            there = here[0] ^ 1 << place
            key = (there, here[1] + (level(there) != level(here[0])))
            if key not in seen:
                seen[key] = (*here, place)
                todo.append(key)
    return None


class _Terminals:
    """A network of gates in one micro-step, where every change takes its own time to each terminal.

    `copies` are what terminals see of the bits that change and of the nets of gates: the expression that reads it
    (numbered as in `Network.expressions`), name and bit. A situation is a bit for each, whether it has the second of
    its two values."""

    def __init__(self, replay: Replay, number: int) -> None:
        self.replay, self.number = replay, number
        self.then, self.now = replay.moments[number : number + 2]
        network = replay.reach.network
        moving = set(replay.moving(number))
        nets = set(network.order)
        self.copies: list[tuple[int, str, int]] = []
        seen: list[Expr] = []
        for reader, x in enumerate(network.expressions):
            words: dict[str, Expr] = {}
            read = reads([x])
            for v in e.variables([x]):
                bits = []
                for i in range(v.width):
                    if read[v.name] >> i & 1 and (v.name in nets or (v.name, i) in moving):
                        bits.append(e.var(str(len(self.copies)), 1))
                        self.copies.append((reader, v.name, i))
                    else:
                        bits.append(e.const(self.then.get(v.name, 0) >> i & 1, 1))
                words[v.name] = e.concat_all(bits[::-1])
            seen += e.substitute([x], words)
        values: list[Expr] = []
        at = 0
        for net in network.order:
            made = network.gates[net]
            values.append(gate(made.kind, [still(x) for x in seen[at : at + len(made.pins)]]).first)
            at += len(made.pins)
        names = [str(i) for i in range(len(self.copies))]
        self._run = e.compile_step([*values, seen[-1]], names)
        self.places = {net: place for place, net in enumerate(network.order)}
        self.labels = [
            f"{network.gates[net].kind} {net}" for net in network.order for _ in network.gates[net].pins
        ]

    def computed(self, situation: int) -> tuple[int, ...]:
        """What each gate drives, and the output last."""
        return self._run(*(situation >> i & 1 for i in range(len(self.copies))))

    def at_rest(self) -> int:
        """The situation before anything has changed: every terminal sees what is driven."""
        situation = 0
        for place, (_, name, bit) in enumerate(self.copies):
            if name not in self.places:
                situation |= (self.then[name] >> bit & 1) << place
        # A round settles at least the nets whose inputs have settled.
        for _ in range(len(self.places) + 1):
            values = self.computed(situation)
            for place, (_, name, _) in enumerate(self.copies):
                if name in self.places and (situation >> place & 1) != values[self.places[name]]:
                    situation ^= 1 << place
        return situation

    def onward(self, situation: int) -> list[int]:
        """The copies that have yet to follow what they copy."""
        values = self.computed(situation)
        out = []
        for place, (_, name, bit) in enumerate(self.copies):
            source = values[self.places[name]] if name in self.places else self.now[name] >> bit & 1
            if source != situation >> place & 1:
                out.append(place)
        return out

    def arrivals(self) -> list[Arrival] | None:
        """An order in which the output changes too often, to its end; None if none is found."""
        situation = self.at_rest()
        level = self.computed(situation)[-1]
        wanted = 1 + (level ^ self.replay.level(self.now))
        way = _way(situation, self.onward, lambda at: self.computed(at)[-1], wanted)
        if way is None:
            return None
        out: list[Arrival] = []
        while way or (way := self.onward(situation)[:1]):
            place = way.pop(0)
            situation ^= 1 << place
            reader, name, bit = self.copies[place]
            label = name if name in self.places else bit_name(self.replay.reach.whole.design, name, bit)
            if reader < len(self.labels):
                label += f" at {self.labels[reader]}"
            new = situation >> place & 1
            values = self.computed(situation)
            nets = {net: values[at] for net, at in self.places.items()}
            out.append(Arrival(label, self.number, 1 - new, new, values[-1], {**self.now, **nets}))
        return out


def bit_name(design: Design, name: str, bit: int) -> str:
    """A bit of a register as the source calls it."""
    register = next((r for r in design.registers if r.name == name), None)
    if register is None or register.width == 1:
        return name
    part = re.fullmatch(r"(.*)\[(\d+):(\d+)\]", name)
    if part:
        low = int(part[3])
        return f"{part[1]}[{low + bit if int(part[2]) >= low else low - bit}]"
    signal = design.signals.get(name)
    msb, lsb = (signal.msb, signal.lsb) if signal else (register.width - 1, 0)
    return element(name, lsb + bit if msb >= lsb else lsb - bit)


# -- in words -----------------------------------------------------------------------------------------------

SAID = {
    "function": "no gates can cure that, for it is what they compute",
    "gates": "the gates as they are written do that, what they compute does not",
}

MOST_TOLD = 6
"""Bits or values that are told in a sentence; the rest is counted."""


def told(glitch: Glitch) -> str:
    """What happens, in words that go on from `the output`."""
    arrival = glitch.arrivals[glitch.first]
    before = {name: value for name, value in glitch.state.items() if name in arrival.seen}
    moved = [f"{a.name} {a.old}→{a.new}" for a in glitch.arrivals[: glitch.first + 1]]
    ends = glitch.arrivals[-1].level
    kept = f"stay {ends}" if ends == glitch.level else f"go from {glitch.level} to {ends} once"
    between = {name: value for name, value in arrival.seen.items() if before.get(name) != value}
    return (
        f"pulses to {arrival.level} at the {glitch.edge} edge from {_values(before)}, where it should {kept}: once "
        f"{_listed(moved)} {'has' if len(moved) == 1 else 'have'} arrived before the rest, {_values(between)}; "
        f"{SAID[glitch.kind]}"
    )


def _values(values: Mapping[str, int]) -> str:
    return _listed([f"{name}={value}" for name, value in values.items()])


def _listed(parts: list[str]) -> str:
    more = f" and {len(parts) - MOST_TOLD} more" if len(parts) > MOST_TOLD else ""
    return ", ".join(parts[:MOST_TOLD]) + more
