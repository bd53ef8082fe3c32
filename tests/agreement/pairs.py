"""Random pairs of small dividers, as designs and as Verilog, and plain enumeration of what they do side by side.

The enumeration knows nothing of this program's machines: a plan is a set of tables, and `Plan.edge` and `Plan.move` say
by themselves what an edge of the clock and a move of the inputs do. All times are half-cycles.
"""

from __future__ import annotations

import random
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from itertools import product
from typing import Any

from prover import expr as e
from prover.design import Design, Edge, Force, Register, Signal
from prover.errors import Where
from prover.expr import Expr

HERE = Where("random.v", 1)

State = tuple[int, int]
"""The register that moves at rising edges, and the one that moves at falling edges."""


@dataclass(frozen=True)
class Plan:
    """A divider of two registers.

    bits      of the first and of the second register
    inputs    bits of its inputs together; the lowest one gates the clock of the first register if it is `gated`
    rising, falling  the next value of each, by first register, second register and inputs
    shown     the output, by first register, second register, clock and inputs
    begins    what reset and initial values make of the first register
    second    the same for the second; None where they leave it alone
    at_once   whether reset acts at once or at the register's edge
    """

    bits: tuple[int, int]
    inputs: int
    rising: dict[tuple[int, int, int], int]
    falling: dict[tuple[int, int, int], int]
    shown: dict[tuple[int, int, int, int], int]
    begins: int
    second: int | None
    at_once: bool
    gated: bool

    def clock(self, level: int, inputs: int) -> int:
        """The clock of the first register."""
        return level & inputs & 1 if self.gated else level

    def at_rest(self, state: State, reset: int) -> State:
        if not (reset and self.at_once):
            return state
        return self.begins, state[1] if self.second is None else self.second

    def edge(self, state: State, level: int, inputs: int, reset: int) -> State:
        """The registers after the clock has left that level."""
        a, b = state
        if not level and self.clock(1, inputs):
            a = self._first(state, inputs, reset)
        if level:
            b = self.falling[a, b, inputs] if not reset or self.second is None else self.second
        return self.at_rest((a, b), reset)

    def _first(self, state: State, inputs: int, reset: int) -> int:
        return self.begins if reset else self.rising[(*state, inputs)]

    def move(self, state: State, level: int, before: int, after: int, reset: int) -> State:
        """The registers after the inputs have moved between two edges."""
        a, b = state
        if self.clock(level, after) and not self.clock(level, before):
            a = self._first(state, after, reset)
        return self.at_rest((a, b), reset)

    def output(self, state: State, level: int, inputs: int) -> int:
        return self.shown[(*state, level, inputs)]

    def states(self) -> Iterator[State]:
        yield from product(range(1 << self.bits[0]), range(1 << self.bits[1]))


def random_plan(rng: random.Random, inputs: int) -> Plan:
    bits = rng.choice([1, 2, 2, 2, 3]), 1
    sizes = 1 << bits[0], 1 << bits[1]
    every = list(product(range(sizes[0]), range(sizes[1]), range(1 << inputs)))
    rising = {key: rng.randrange(sizes[0]) for key in every}
    if rng.random() < 0.5:
        # A count that the inputs and the other register hold up now and then.
        rising = {(a, b, u): (a + (rng.random() < 0.8)) % sizes[0] for a, b, u in every}
    falling = {(a, b, u): rng.choice([b, a % sizes[1], rng.randrange(sizes[1])]) for a, b, u in every}
    shown = {
        (a, b, level, u): rng.getrandbits(1) if rng.random() < 0.4 else a >> (bits[0] - 1)
        for a, b, u in every
        for level in (0, 1)
    }
    return Plan(
        bits,
        inputs,
        rising,
        falling,
        shown,
        rng.randrange(sizes[0]),
        None if rng.random() < 0.2 else rng.randrange(sizes[1]),
        rng.random() < 0.4,
        inputs > 0 and rng.random() < 0.3,
    )


def recoded(rng: random.Random, plan: Plan) -> Plan:
    """The same divider with its first register's values renamed."""
    count = 1 << plan.bits[0]
    code = list(range(count))
    rng.shuffle(code)
    back = {value: i for i, value in enumerate(code)}
    return replace(
        plan,
        rising={(a, b, u): code[plan.rising[back[a], b, u]] for a, b, u in plan.rising},
        falling={(a, b, u): plan.falling[back[a], b, u] for a, b, u in plan.falling},
        shown={(a, b, level, u): plan.shown[back[a], b, level, u] for a, b, level, u in plan.shown},
        begins=code[plan.begins],
        at_once=plan.at_once,
    )


def mutated(rng: random.Random, plan: Plan) -> Plan:
    """The divider with one entry of a table changed."""
    if rng.random() < 0.4:
        key = rng.choice(list(plan.shown))
        return replace(plan, shown={**plan.shown, key: 1 - plan.shown[key]})
    place = rng.choice(list(plan.rising))
    other = (plan.rising[place] + 1) % (1 << plan.bits[0])
    return replace(plan, rising={**plan.rising, place: other})


# -- as a design and as Verilog ----------------------------------------------------------------------------


def design(plan: Plan, name: str) -> Design:
    """The plan as a design with a reset `rst` and, where it has inputs, one port `u`."""
    a, b = e.var("a", plan.bits[0]), e.var("b", plan.bits[1])
    clock, reset = e.var("clk", 1), e.var("rst", 1)
    ports = {"clk": 1, "rst": 1}
    u = None
    if plan.inputs:
        ports["u"] = plan.inputs
        u = e.var("u", plan.inputs)

    def table(entries: Mapping[Any, int], words: Sequence[Expr | None], width: int) -> Expr:
        out = e.const(0, width)
        for key, value in entries.items():
            here = e.conj(
                e.eq(w, e.const(k, w.width)) for w, k in zip(words, key, strict=True) if w is not None
            )
            out = e.ite(here, e.const(value, width), out)
        return out

    gate = e.bvand(clock, e.extract(u, 0, 0)) if plan.gated and u is not None else clock
    first = table(plan.rising, (a, b, u), a.width)
    second = table(plan.falling, (a, b, u), b.width)
    if not plan.at_once:
        first = e.ite(reset, e.const(plan.begins, a.width), first)
        second = second if plan.second is None else e.ite(reset, e.const(plan.second, b.width), second)

    def forces(value: int | None, width: int) -> tuple[Force, ...]:
        held = plan.at_once and value is not None
        return (Force(reset, e.const(value or 0, width), HERE),) if held else ()

    registers = (
        Register(
            "a", a.width, "flip-flop", (Edge(gate, first),), forces(plan.begins, a.width), plan.begins, HERE
        ),
        Register(
            "b",
            b.width,
            "flip-flop",
            (Edge(e.bvnot(clock), second),),
            forces(plan.second, b.width),
            plan.second,
            HERE,
        ),
    )
    output = table(plan.shown, (a, b, clock, u), 1)
    signals = {"out": Signal("out", output, 0, 0, False, HERE)}
    return Design(name, ports, ("out",), registers, signals, {}, (), "")


def verilog(plan: Plan, name: str) -> str:
    """The same as Verilog."""
    wide, narrow = plan.bits
    index = "{a, b, u}" if plan.inputs else "{a, b}"
    shift = plan.inputs

    def rows(entries: dict[tuple[int, int, int], int], width: int) -> str:
        cases = [
            f"      {wide + narrow + shift}'d{((a << narrow | b) << shift) | u}: f = {width}'d{value};"
            for (a, b, u), value in entries.items()
        ]
        return "\n".join(cases)

    shown = "\n".join(
        f"      {wide + narrow + 1 + shift}'d{(((a << narrow | b) << 1 | level) << shift) | u}: show = 1'd{value};"
        for (a, b, level, u), value in plan.shown.items()
    )
    ports = f", input [{plan.inputs - 1}:0] u" if plan.inputs else ""
    edge = "ck" if plan.gated else "clk"
    at_once = " or posedge rst" if plan.at_once else ""
    index_shown = "{a, b, clk, u}" if plan.inputs else "{a, b, clk}"
    resets = [f"if (rst) a <= {plan.begins}; else ", f"if (rst) b <= {plan.second}; else "]
    second = "" if plan.second is None else resets[1]
    at_fall = at_once if plan.second is not None else ""
    taken = rows(plan.rising, wide), rows(plan.falling, narrow)
    return f"""\
module {name} (input clk, input rst{ports}, output out);
  reg [{wide - 1}:0] a;
  reg [{narrow - 1}:0] b;
  wire ck = clk{" & u[0]" if plan.gated else ""};
  function [{wide - 1}:0] f(input [{wide + narrow + shift - 1}:0] i);
    case (i)
{taken[0]}
    endcase
  endfunction
  function [{narrow - 1}:0] g(input [{wide + narrow + shift - 1}:0] i);
    case (i)
{taken[1].replace(": f =", ": g =")}
    endcase
  endfunction
  function show(input [{wide + narrow + shift}:0] i);
    case (i)
{shown}
    endcase
  endfunction
  always @(posedge {edge}{at_once}) {resets[0]}a <= f({index});
  always @(negedge clk{at_fall}) {second}b <= g({index});
  assign out = show({index_shown});
endmodule
"""


# -- side by side, by enumeration --------------------------------------------------------------------------

Together = tuple[State, State, int, int]
"""Both dividers' registers, the clock's level, and the inputs."""

HELD = 40
"""Half-cycles of reset, more than these dividers have states."""


def starts(old: Plan, new: Plan, moving: bool) -> set[Together]:
    """Where both are when reset is released from both.

    While inputs move under reset both have seen the same ones, so they are held side by side."""
    values = range(1 << old.inputs)
    here = {
        (old.at_rest(s, 1), new.at_rest(t, 1), level, u)
        for s in old.states()
        for t in new.states()
        for level in (0, 1)
        for u in values
    }
    for _ in range(HELD):
        here = {(old.edge(s, at, u, 1), new.edge(t, at, u, 1), 1 - at, u) for s, t, at, u in here}
        if moving:
            here = {
                (old.move(s, at, u, v, 1), new.move(t, at, u, v, 1), at, v)
                for s, t, at, u in here
                for v in values
            }
    return here


def first_difference(old: Plan, new: Plan, moving: bool, lag: int) -> int | None:
    """The half-cycle of the later output in which it is first another than the earlier one was; None if never.

    Breadth first over all that both can be in together, with what the earlier output was in the half-cycles before."""
    values = range(1 << old.inputs)
    late = abs(lag)

    def outputs(here: Together) -> tuple[int, int]:
        s, t, level, u = here
        a, b = old.output(s, level, u), new.output(t, level, u)
        return (a, b) if lag >= 0 else (b, a)

    # A half-cycle has two rests: after its edge, and after the inputs have moved.
    frontier: set[tuple[Together, tuple[tuple[int, int], ...]]] = set()
    begun = starts(old, new, moving)
    for here in begun:
        if not late and len(set(outputs(here))) > 1:
            return 0
    for here in begun:
        s, t, level, u = here
        for v in values if moving else (u,):
            after = old.move(s, level, u, v, 0), new.move(t, level, u, v, 0), level, v
            if not late and len(set(outputs(after))) > 1:
                return 0
            queue: tuple[tuple[int, int], ...] = ((outputs(here)[0], outputs(after)[0]),)
            frontier.add((after, queue))
    seen = set(frontier)
    half_cycle = 0
    while frontier:
        half_cycle += 1
        following = set()
        for (s, t, level, u), queue in frontier:
            at_edge = old.edge(s, level, u, 0), new.edge(t, level, u, 0), 1 - level, u
            for v in values if moving else (u,):
                after = (
                    old.move(at_edge[0], 1 - level, u, v, 0),
                    new.move(at_edge[1], 1 - level, u, v, 0),
                    1 - level,
                    v,
                )
                longer = (*queue, (outputs(at_edge)[0], outputs(after)[0]))
                if len(longer) > late:
                    then = longer[-1 - late]
                    if then != (outputs(at_edge)[1], outputs(after)[1]):
                        return half_cycle
                following.add((after, longer[-late:] if late else ()))
        frontier = following - seen
        seen |= frontier
    return None


def words(old: Plan, new: Plan, inputs: int, length: int) -> list[tuple[list[int], list[int]]]:
    """Both outputs from every start, with the inputs held."""
    out = []
    for s, t, level, u in starts(old, new, False):
        if u != inputs:
            continue
        a, b = [], []
        for _ in range(length):
            a.append(old.output(s, level, u))
            b.append(new.output(t, level, u))
            s, t, level = old.edge(s, level, u, 0), new.edge(t, level, u, 0), 1 - level
        out.append((a, b))
    return out


def least_lag(old: Plan, new: Plan, furthest: int) -> int | None:
    """The least lag at which the outputs agree with the inputs held at any value; None if there is none so near."""
    every = [pair for u in range(1 << old.inputs) for pair in words(old, new, u, 4 * furthest)]
    for size in range(furthest + 1):
        for lag in (size, -size):
            if all(_agree(a[max(-lag, 0) :], b[max(lag, 0) :]) for a, b in every):
                return lag
    return None


def _agree(a: Sequence[int], b: Sequence[int]) -> bool:
    return all(x == y for x, y in zip(a, b, strict=False))


def same_once_settled(old: Plan, new: Plan) -> int | None:
    """Half-cycles after which every power-up state of both is on its loop, if all these loops show one wave, at
    whatever phase, for every value of the inputs; None if they don't."""
    worst = 0
    for u in range(1 << old.inputs):
        shown: set[tuple[int, ...]] = set()
        for plan in (old, new):
            step = {
                (s, level): (plan.edge(s, level, u, 0), 1 - level) for s in plan.states() for level in (0, 1)
            }
            for here in step:
                path = [here]
                while step[path[-1]] not in path:
                    path.append(step[path[-1]])
                enters = path.index(step[path[-1]])
                worst = max(worst, enters)
                wave = [plan.output(s, level, u) for s, level in path[enters:]]
                size = next(
                    n for n in range(1, len(wave) + 1) if wave == wave[n:] + wave[:n] and len(wave) % n == 0
                )
                shown.add(min(tuple(wave[i:size] + wave[:i]) for i in range(size)))
        if len(shown) > 1:
            return None
    return worst
