"""Runs of a design whose inputs move, enumerated one by one: slow, plain, and with nothing of the prover's machine.

The micro-steps are carried out on numbers as DEVELOPERS.md words them. A node of the search holds the registers, the
inputs, every value that the inputs have had, and the pulse at hand; all nodes of one half-cycle are looked at before
those of the next.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cached_property
from itertools import pairwise, product

from agreement import brute

from prover import expr as e
from prover.design import Design

State = tuple[int, ...]
Nominal = Mapping[int, tuple[int, int]]
"""Half-cycles of the low and the high pulse, by the inputs' value."""

Node = tuple[State, int, frozenset[int], "tuple[int, bool] | None"]
"""State, the input's value, all values so far, and the pulse: the edges since it began, and whether a move began it."""


class Circuit:
    """A design with one moving input, on numbers. A state is the registers' values and the clock's level.

    Besides the clock there may be an input `rst`, active high: 0 but for the time before a run begins."""

    def __init__(self, design: Design, moving: str, output: str) -> None:
        self.registers = design.registers
        self.reset = "rst" in design.inputs
        self.names = [*(r.name for r in design.registers), "clk", moving, *(["rst"] if self.reset else [])]
        wanted = []
        for register in design.registers:
            for edge in register.edges:
                wanted += [edge.clock, edge.data]
            for force in register.forces:
                wanted += [force.when, force.value]
        self.look = e.compile_step([*wanted, design.signals[output].value], self.names)
        self.values = range(1 << design.inputs[moving])
        self.known: dict[tuple[State, State], State] = {}
        # Registers that the output is made of, now or later.
        self.matters = {v.name for v in e.variables([design.signals[output].value])}
        for _ in design.registers:
            for register in design.registers:
                if register.name in self.matters:
                    of = [x for edge in register.edges for x in (edge.clock, edge.data)]
                    of += [x for force in register.forces for x in (force.when, force.value)]
                    self.matters |= {v.name for v in e.variables(of)}

    def at(self, state: State, value: int, reset: int = 0) -> State:
        """All that there is: registers, clock and inputs."""
        return (*state, value, reset) if self.reset else (*state, value)

    def out(self, state: State, value: int) -> int:
        return self.look(*self.at(state, value))[-1]

    @cached_property
    def gated(self) -> list[int]:
        """Where `look` has the clocks that several bits make."""
        out, at = [], 0
        for register in self.registers:
            for edge in register.edges:
                if register.name in self.matters and len(e.variables([edge.clock])) > 1:
                    out.append(at)
                at += 2
            at += 2 * len(register.forces)
        return out

    def edge(self, state: State, value: int, reset: int = 0) -> State:
        """After an edge of the clock."""
        turned = (*state[:-1], 1 - state[-1])
        return self.settle(self.at(state, value, reset), self.at(turned, value, reset))[: len(state)]

    def move(self, state: State, value: int, to: int) -> State:
        """After a move of the input."""
        return self.settle(self.at(state, value), self.at(state, to))[: len(state)]

    def settle(self, before: State, now: State) -> State:
        first = (before, now)
        if first not in self.known:
            self.known[first] = self.chain(before, now)[-1]
        return self.known[first]

    def chain(self, before: State, now: State) -> list[State]:
        """The moments from before a change to where all has settled."""
        out = [before, now]
        for _ in range(40):
            after = self.micro(*out[-2:])
            if after == out[-1]:
                return out
            out.append(after)
        raise AssertionError("a machine that does not settle")

    def pulses(self, state: State, value: int) -> bool:
        """Whether on an edge the output changes more often than the rests show, or a set or clear that is inactive
        in two moments is active between them, for some order of the bits that change in a micro-step; or a gated
        clock, low before and after, is high on the way."""
        turned = (*state[:-1], 1 - state[-1])
        chain = self.chain(self.at(state, value), self.at(turned, value))
        levels = [self.look(*moment)[-1] for moment in chain]
        if sum(a != b for a, b in pairwise(levels)) > 1:
            return True
        for clock in self.gated:
            first, *between, last = (self.look(*moment)[clock] for moment in chain)
            if any(between) and not first and not last:
                return True
        for number, (then, now) in enumerate(pairwise(chain)):
            seen = [self.look(*mixed) for mixed in mixes(then, now)]
            if most_changes([each[-1] for each in seen]) > (seen[0][-1] != seen[-1][-1]):
                return True
            for place, when, wanted in self.forces():
                passes = any(each[when] for each in seen) and not seen[0][when] and not seen[-1][when]
                if passes and any(self.look(*moment)[wanted] != moment[place] for moment in chain[number:]):
                    return True
        return False

    def forces(self) -> Iterator[tuple[int, int, int]]:
        """Each force: its register's place, and where `look` has its condition and its value."""
        at = 0
        for place, register in enumerate(self.registers):
            at += 2 * len(register.edges)
            for _ in register.forces:
                if register.name in self.matters:
                    yield place, at, at + 1
                at += 2

    def micro(self, before: State, now: State) -> State:
        """Edges that a register sees take effect where nothing forces it, before or now; forces win, the first most."""
        was, on = self.look(*before), self.look(*now)
        after, at = list(now), 0
        for place, register in enumerate(self.registers):
            edges = range(at, at + 2 * len(register.edges), 2)
            at += 2 * len(register.edges)
            forces = range(at, at + 2 * len(register.forces), 2)
            at += 2 * len(register.forces)
            free = not any(was[i] or on[i] for i in forces)
            for i in reversed(edges):
                if free and on[i] and not was[i]:
                    after[place] = on[i + 1]
            for i in reversed(forces):
                if on[i]:
                    after[place] = on[i + 1]
        return tuple(after)

    def starts(self, value: int) -> list[State]:
        """Initial values at either level of the clock, settled; or what a long reset leaves of any values."""
        if self.reset:
            return self.released(value)
        initial = tuple(r.initial or 0 for r in self.registers)
        return [self.settle((*initial, level, value), (*initial, level, value))[:-1] for level in (0, 1)]

    def released(self, value: int) -> list[State]:
        """The states after reset was held for some time, from every state, and released."""
        widths = [r.width for r in self.registers]
        found = set()
        for state in product(*(range(1 << width) for width in widths), (0, 1)):
            now = self.at(state, value, 1)
            here = self.settle(now, now)[: len(state)]
            for _ in range(2 * len(widths) + 6):
                here = self.edge(here, value, 1)
            found.add(self.settle(self.at(here, value, 1), self.at(here, value))[: len(state)])
        return sorted(found)

    def held(self, states: Sequence[State], value: int) -> tuple[dict[State, State], dict[State, int]]:
        """Step and output of these states and all that they lead to, with the input held."""
        step: dict[State, State] = {}
        todo = list(states)
        while todo:
            state = todo.pop()
            if state not in step:
                step[state] = self.edge(state, value)
                todo.append(step[state])
        return step, {state: self.out(state, value) for state in step}


def mixes(then: State, now: State) -> list[State]:
    """What there is when some of the bits that change have done so: a place for each set of them."""
    changed = [(i, 1 << b) for i in range(len(then)) for b in range(8) if (then[i] ^ now[i]) >> b & 1]
    out = [then]
    for i, bit in changed:
        out += [(*each[:i], each[i] ^ bit, *each[i + 1 :]) for each in out]
    return out


def most_changes(levels: Sequence[int]) -> int:
    """How often a level changes at most while one bit after the other does so, in any order."""
    most = [0] * len(levels)
    for chosen in range(1, len(levels)):
        before = [chosen ^ 1 << bit for bit in range(chosen.bit_length()) if chosen >> bit & 1]
        most[chosen] = max(most[each] + (levels[each] != levels[chosen]) for each in before)
    return most[-1]


@dataclass(frozen=True)
class Found:
    """What enumeration comes to.

    broken  half-cycles of the shortest run that breaks the claim on pulses, and whether a move ends it; if none does
            at rest, of the shortest to a pulse within a half-cycle
    reached states reached, by the inputs' value, where none does at rest
    within  whether the claim is broken by a pulse within the last half-cycle
    """

    broken: tuple[int, bool] | None
    reached: dict[int, set[State]]
    within: bool = False


def enumerate_runs(circuit: Circuit, nominal: Nominal, long_too: bool) -> Found:
    """All runs from the initial values. A pulse is too short if fewer whole half-cycles lie in it than the shortest
    nominal one of the values so far has, and too long (if that counts) if it reaches into more than the longest has.

    A pulse is None while its beginning is not seen, else the edges since, and whether a move began it."""
    most = 2 + max(max(pair) for pair in nominal.values())
    # State, value, values so far, pulse: at rest after the edge of the half-cycle, or at the start.
    here: set[Node] = set()
    for value in nominal:
        here |= {(state, value, frozenset([value]), None) for state in circuit.starts(value)}
    seen: set[Node] = set()
    half_cycle, pulsed = 0, None
    while here:
        moved: set[Node] = set()
        for (state, value, values, pulse), to in product(here, nominal):
            then = circuit.move(state, value, to)
            level, now = circuit.out(state, value), circuit.out(then, to)
            so_far = values | {to}
            if level != now:
                if pulse is not None and pulse[0] - pulse[1] < min(nominal[v][level] for v in so_far):
                    return Found((half_cycle + 1, True), {})
                moved.add((then, to, so_far, (0, True)))
            else:
                moved.add((then, to, so_far, pulse))
        moved -= seen
        seen |= moved
        half_cycle += 1
        here, pulses = set(), False
        for state, value, values, pulse in moved:
            pulses = pulses or circuit.pulses(state, value)
            then = circuit.edge(state, value)
            level, now = circuit.out(state, value), circuit.out(then, value)
            lasted = None if pulse is None else min(pulse[0] + 1, most)
            if level != now:
                whole = None if lasted is None or pulse is None else lasted - pulse[1]
                if whole is not None and whole < min(nominal[v][level] for v in values):
                    return Found((half_cycle + 1, False), {})
                here.add((then, value, values, (0, False)))
            elif lasted is None or pulse is None:
                here.add((then, value, values, None))
            else:
                if long_too and lasted + 1 > max(nominal[v][level] for v in values):
                    return Found((half_cycle + 1, False), {})
                here.add((then, value, values, (lasted, pulse[1])))
        if pulses and pulsed is None:
            pulsed = (half_cycle + 1, False)
    reached: dict[int, set[State]] = {value: set() for value in nominal}
    for state, value, _, _ in seen:
        reached[value].add(state)
    return Found(pulsed, reached, within=pulsed is not None)


def longest_way_back(circuit: Circuit, states: set[State], value: int, low: int, high: int) -> int | None:
    """Half-cycles until the last of the states is good with the input held; None if one never is."""
    step, output = circuit.held(sorted(states), value)
    found = brute.analyse(step, output, low + high, high)
    times = [found.recovery_half_cycles[state] for state in states]
    return None if None in times else max(time for time in times if time is not None)


def resting(circuit: Circuit, states: set[State], value: int) -> tuple[set[int], int] | None:
    """Levels at which the output comes to stay with the input held, and the half-cycles that takes at most; None if
    from some state it never does."""
    step, output = circuit.held(sorted(states), value)
    levels, longest = set(), 0
    for state in states:
        path = [state]
        while len(path) <= len(step):
            path.append(step[path[-1]])
        loop = path[path.index(path[-1]) :]
        if len({output[s] for s in loop}) > 1:
            return None
        level = output[loop[0]]
        levels.add(level)
        changes = [i + 1 for i, s in enumerate(path) if output[s] != level]
        longest = max([longest, *changes])
    return levels, longest
