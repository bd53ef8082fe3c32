"""Accumulators: registers that go round a circle of M values in strides of c, with an output that is 1 on an arc.

Such a divider makes c pulses in M input cycles, and its round may be too long to follow: 2^32 steps of 32 bits. But
nothing has to be followed. If the arc and what is left of the circle are both at least a stride long, each time round
makes one pulse, and a rise comes with the first stride onto the arc; from there it is ⌊M/c⌋ or ⌈M/c⌉ strides to the
next. If gcd(M, c) divides the arc's length, the circle's cosets differ in nothing but where they begin, so that every
state has the same wave. So there are only four questions about single steps, for any M: the register stays on the
circle, it goes on by a stride, the output is that of the arc, and each power-up state gets there. (A rigid rotation
of Z/M; its gaps are the simplest case of Sós's three-distance theorem, 1958; from memory.)

The output may also be half a cycle late, from a flip-flop on the other edge.

Limits: one register holds the place on the circle and moves with one edge of the clock.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction
from itertools import accumulate, pairwise
from math import ceil, floor, gcd

from prover import expr as e
from prover.certificate import Obligation, onwards
from prover.expr import Expr
from prover.rhythm import Goal, Mean, Orbit
from prover.system import State, System

BEHIND = 8
"""Half-cycles by which the output may be behind the accumulator, at most."""

JOINED = 32
"""Half-cycles within which every power-up state has to be on the circle."""

METHOD = "{name} goes round {modulus} values by {stride} at a time, the output 1 on {arc} of them (solver)"


@dataclass(frozen=True, slots=True)
class Accumulator:
    """The place on the circle is (register − base) mod 2^width, which is less than `modulus`.

    register, width, base   where it is read
    modulus, stride         values on the circle, and how far an edge at which the clock was `level` goes on
    arc                     where on the circle the output begins to be 1, and for how many values
    late                    the output follows half an input cycle after the accumulator
    behind                  half-cycles after which a state on the circle has the output of the arc
    joined                  half-cycles after which every power-up state is on the circle
    worst, slowest          half-cycles until every power-up state is good, and one that needs so long if it is known
    """

    register: str
    width: int
    base: int
    modulus: int
    stride: int
    level: int
    arc: tuple[int, int]
    late: bool
    behind: int
    joined: int = 0
    worst: int = 0
    slowest: State | None = None

    @property
    def mean(self) -> Fraction:
        """Input cycles from rise to rise, on average."""
        return Fraction(self.modulus, self.stride)

    def runs(self, level: int) -> tuple[int, int]:
        """The least and the greatest length of the output's runs at a level, in half-cycles."""
        size = self.arc[1] if level else self.modulus - self.arc[1]
        least = size - self.stride + self._common
        return 2 * -(-least // self.stride), 2 * -(-size // self.stride)

    @property
    def _common(self) -> int:
        return gcd(self.modulus, self.stride)

    @property
    def goal(self) -> Goal:
        """What is good, with the lengths that runs may have in place of one round of them."""
        (short_high, long_high), (short_low, long_low) = self.runs(1), self.runs(0)
        lengths = ((1, short_high), (0, long_low), (1, long_high), (0, short_low))
        common = self._common
        return Goal(2 * self.modulus // common, 2 * self.arc[1] // common, lengths)

    @property
    def regular(self) -> bool:
        """Whether each round makes one pulse, and all cosets have the same wave."""
        rest = self.modulus - self.arc[1]
        return min(self.arc[1], rest) >= self.stride and self.arc[1] % self._common == 0

    def has(self, mean: Mean) -> bool:
        """Whether the wave is one of these."""
        of_high = mean.high is None or set(self.runs(1)) == {mean.high}
        return self.regular and self.mean == mean.ratio and of_high

    def method(self) -> str:
        return METHOD.format(name=self.register, modulus=self.modulus, stride=self.stride, arc=self.arc[1])

    # -- as formulas over a state ---------------------------------------------------------------------------

    def place(self, state: Expr) -> Expr:
        """The place on the circle, one bit wider than the register, by the register's value."""
        return e.resize(e.bvsub(state, e.const(self.base, self.width)), self.width + 1, False)

    def on_circle(self, state: Expr) -> Expr:
        return e.bvult(self.place(state), e.const(self.modulus, self.width + 1))

    def wanted(self, state: Expr, clock: Expr) -> Expr:
        """The output that belongs to a place, at a level of the clock."""
        now = self._on_arc(self.place(state))
        if not self.late:
            return now
        before = self._round(e.bvadd(self.place(state), self._const(self.modulus - self.stride)))
        return e.ite(e.eq(clock, e.const(self.level, 1)), now, self._on_arc(before))

    def _on_arc(self, place: Expr) -> Expr:
        beyond = self._round(e.bvadd(place, self._const(self.modulus - self.arc[0])))
        return e.bvult(beyond, self._const(self.arc[1]))

    def next_place(self, state: Expr) -> Expr:
        return self._round(e.bvadd(self.place(state), self._const(self.stride)))

    def _round(self, x: Expr) -> Expr:
        modulus = self._const(self.modulus)
        return e.ite(e.bvult(x, modulus), x, e.bvsub(x, modulus))

    def _const(self, value: int) -> Expr:
        return e.const(value, self.width + 1)


# -- what has to hold --------------------------------------------------------------------------------------


class Steps:
    """The states and outputs some half-cycles on, as expressions over one at the start."""

    def __init__(self, system: System) -> None:
        self.system = system
        self.states = [[e.var(name, width) for name, width in system.variables]]
        self.outputs: list[Expr] = []

    def __getitem__(self, count: int) -> list[Expr]:
        self._follow(count)
        return self.states[count]

    def output(self, count: int) -> Expr:
        self._follow(count + 1)
        return self.outputs[count]

    def _follow(self, count: int) -> None:
        while len(self.states) <= count:
            *after, level = onwards(self.system, self.states[-1], len(self.outputs))
            self.states.append(after)
            self.outputs.append(level)


def obligations(system: System, found: Accumulator) -> list[Obligation]:
    """What has to hold for every power-up state to be good after `worst` half-cycles, and for good."""
    steps, at = Steps(system), system.names.index(found.register)
    first = steps[0][at]
    moves = e.eq(steps[0][-1], e.const(found.level, 1))
    onward = e.ite(moves, found.next_place(first), found.place(first))
    there = found.on_circle(first)
    out = [
        Obligation(
            "the accumulator stays on its circle", e.bvand(there, e.bvnot(found.on_circle(steps[1][at])))
        ),
        Obligation(
            "it goes on by its stride", e.conj([there, e.bvnot(e.eq(found.place(steps[1][at]), onward))])
        ),
        Obligation("the output is that of the arc", e.bvand(there, wrong(steps, found, at, found.behind))),
        Obligation(
            "every power-up state gets on the circle",
            e.bvand(system.settled, e.bvnot(found.on_circle(steps[found.joined][at]))),
        ),
    ]
    for count in range(found.worst, found.joined + found.behind):
        late = e.bvand(system.settled, wrong(steps, found, at, count))
        out.append(Obligation(f"the output is right after {count} half-cycles", late))
    return out


def wrong(steps: Steps, found: Accumulator, at: int, count: int) -> Expr:
    """True of a state from which the output is not that of the place, so many half-cycles on."""
    state = steps[count]
    return e.bvnot(e.eq(steps.output(count), found.wanted(state[at], state[-1])))


def starts_well(system: System, found: Accumulator, orbit: Orbit) -> bool:
    """Whether the run has no gap and no high run but those of the wave; it is known for longer than all that begin
    before the wave is right."""
    runs = [*orbit.runs(rounds=1)]
    begins = [*accumulate((size for _, size in runs), initial=0)]
    whole = [(level, size) for level, size in runs[1:-1]]
    rises = [at for at, (level, _) in zip(begins[1:], runs[1:], strict=False) if level]
    gaps = {b - a for a, b in pairwise(rises)}
    longest = 2 * ceil(found.mean)
    return (
        gets_right(system, found, orbit.start)
        and orbit.lead_half_cycles > found.worst + 2 * longest
        and gaps <= {2 * floor(found.mean), longest}
        and {size for level, size in whole if level} <= set(range(found.runs(1)[0], found.runs(1)[1] + 1))
    )


def gets_right(system: System, found: Accumulator, state: State) -> bool:
    """Whether the wave is the arc's once every power-up state has become good."""
    at = system.names.index(found.register)
    value, clock = e.var("value", found.width), e.var("clock", 1)
    place = e.compile_step([found.on_circle(value), found.wanted(value, clock)], ["value", "clock"])
    state = onward(system, state, found.worst)
    if not place(state[at], state[-1])[0]:
        return False
    for _ in range(found.behind):
        if system.out(state) != place(state[at], state[-1])[1]:
            return False
        state = system.next(state)
    return True


def needs_long(system: System, found: Accumulator, state: State) -> bool:
    """Whether a state is at rest, and not good before `worst`."""
    values = dict(zip(system.names, state, strict=True))
    if len(state) != len(system.names) or e.evaluate([system.settled], values) != [1]:
        return False
    return found.worst == 0 or e.evaluate(
        [wrong(Steps(system), found, system.names.index(found.register), found.worst - 1)], values
    ) == [1]


def onward(system: System, state: State, count: int) -> State:
    """The state so many half-cycles on."""
    for _ in range(count):
        state = system.next(state)
    return state
