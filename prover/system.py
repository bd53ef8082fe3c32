"""System: the half-cycle transition relation of a divider, and the micro-steps it is made of.

One step is one edge of the input clock; the clock's level is the last component of a state. A step is a chain
of micro-steps at zero delay. A micro-step looks at two moments, before and after the last change, and lets
every register react: an edge on its clock makes it take its data, an active set or clear forces its value.
An edge takes effect only where no force on the register was active before or after it, so a clear that is
released in the same micro-step wins over the edge. The chain ends when nothing changes any more; its length
is bounded by a number that is proved for every state (`settling.py` asks for it), or a state is shown that
never settles.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import TYPE_CHECKING

from prover import expr as e
from prover.design import Design, Register
from prover.errors import InternalError
from prover.expr import Expr

if TYPE_CHECKING:
    from prover.linear import Logs

State = tuple[int, ...]
"""Values of all registers in the design's order, then the clock's level."""

Moment = dict[str, Expr]
"""What every register, the clock and every other input is at one moment, as expressions over the state."""


@dataclass(frozen=True, slots=True)
class Inputs:
    """The values at which the inputs other than the clock are held, by port."""

    values: tuple[tuple[str, int], ...]

    @staticmethod
    def of(values: Mapping[str, int]) -> Inputs:
        return Inputs(tuple(sorted(values.items())))

    def moment(self, widths: Mapping[str, int]) -> Moment:
        return {name: e.const(value, widths[name]) for name, value in self.values}


def micro_step(design: Design, before: Moment, now: Moment, edge_wins: bool = False) -> Moment:
    """Every register one micro-step after `now`, where `before` is the moment before the last change.

    With `edge_wins` an edge takes effect although a clear is released in the same micro-step: the other
    outcome of that race, used to tell what hangs on it.
    """
    after = dict(now)
    wanted: list[Expr] = []
    for register in design.registers:
        wanted += [edge.clock for edge in register.edges] + [force.when for force in register.forces]
    then_values = e.substitute(wanted, before)
    watched = e.substitute(wanted, now)
    results: list[Expr] = []
    for register in design.registers:
        results += [edge.data for edge in register.edges] + [force.value for force in register.forces]
    taken = e.substitute(results, now)
    at = 0
    for register in design.registers:
        n, m = len(register.edges), len(register.forces)
        was, on = then_values[at : at + n + m], watched[at : at + n + m]
        values = taken[at : at + n + m]
        at += n + m
        after[register.name] = _react(now[register.name], was, on, values, n, edge_wins)
    return after


def _react(
    held: Expr, was: Sequence[Expr], on: Sequence[Expr], values: Sequence[Expr], edges: int, edge_wins: bool
) -> Expr:
    """One register's next value: `was` and `on` are its clocks, then its forces, before and now."""
    forced_now = e.disj(on[edges:])
    forced_before = e.FALSE if edge_wins else e.disj(was[edges:])
    free = e.bvnot(e.bvor(forced_before, forced_now))
    out = held
    for i in reversed(range(edges)):
        fires = e.bvand(e.bvand(e.bvnot(was[i]), on[i]), free)
        out = e.ite(fires, values[i], out)
    for i in reversed(range(edges, len(on))):
        out = e.ite(on[i], values[i], out)
    return out


def settled_when(registers: Sequence[Register], now: Moment) -> Expr:
    """One bit: no force is pulling any of the registers away from the value it has."""
    parts: list[Expr] = []
    for register in registers:
        higher = e.FALSE
        for force in register.forces:
            when, value = e.substitute([force.when, force.value], now)
            acts = e.bvand(when, e.bvnot(higher))
            parts.append(e.implies(acts, e.eq(now[register.name], value)))
            higher = e.bvor(higher, when)
    return e.conj(parts)


def same(registers: Sequence[Register], a: Moment, b: Moment) -> Expr:
    """One bit: all registers agree in the two moments."""
    return e.conj(e.eq(a[r.name], b[r.name]) for r in registers)


def unroll(design: Design, before: Moment, now: Moment, limit: int, edge_wins: bool = False) -> list[Moment]:
    """The moments from `now` on, one a micro-step, until two are the same expressions or `limit` is reached."""
    chain = [now]
    for count in range(limit):
        # Choices (values that x stands for) are new at every micro-step.
        after = micro_step(design, before, now, edge_wins)
        after = _renamed_choices(design, after, now, count)
        if all(after[r.name] is now[r.name] for r in design.registers):
            break
        chain.append(after)
        before, now = now, after
    return chain


def _renamed_choices(design: Design, after: Moment, now: Moment, count: int) -> Moment:
    names = [r.name for r in design.registers]
    fresh = {
        v.name: e.var(f"{v.name}@{count}", v.width)
        for v in e.variables([after[n] for n in names])
        if v.name.startswith("?") and "@" not in v.name
    }
    if not fresh:
        return after
    renamed = e.substitute([after[n] for n in names], fresh)
    return {**after, **dict(zip(names, renamed, strict=True))}


@dataclass(frozen=True)
class System:
    """The machine with its inputs held: a map from states to states, and the output of a state.

    variables   registers and clock, in the order of a State, with their widths
    step        the next state, over the variables (and over choices, where x decides)
    output      one bit over the variables: the output in the half-cycle of the state
    settled     one bit over the variables: a power-up state
    chain       the moments of one step; chain[0] is just after the clock's edge, chain[-1] is `step`
    words       variables that stand for several registers side by side (see recode), with these, lowest first
    logs        what the first variable counts, in a linear shift register (see linear)
    slices      variables that are some bits of a register, with that register and the lowest of them (see recode)
    grays       variables that are the number that a register in Gray code stands for, with that register (see recode)
    """

    design: Design
    clock: str
    inputs: Inputs
    variables: tuple[tuple[str, int], ...]
    step: tuple[Expr, ...]
    output: Expr
    settled: Expr
    chain: tuple[Moment, ...]
    words: tuple[tuple[str, tuple[str, ...]], ...] = ()
    logs: Logs | None = None
    slices: tuple[tuple[str, str, int], ...] = ()
    grays: tuple[tuple[str, str], ...] = ()

    @property
    def depth(self) -> int:
        """Micro-steps after which every step has settled."""
        return len(self.chain) - 1

    @property
    def bits(self) -> int:
        """Bits of a state, the clock's level among them."""
        return sum(width for _, width in self.variables)

    @cached_property
    def names(self) -> list[str]:
        return [name for name, _ in self.variables]

    @cached_property
    def choices(self) -> list[tuple[str, int]]:
        """The choices that a step or the output depends on, with their widths."""
        found = e.variables([*self.step, self.output])
        return [(v.name, v.width) for v in found if v.name.startswith("?")]

    @cached_property
    def run(self) -> Callable[..., tuple[int, ...]]:
        """Compiled: state values and choices in order, to next state and then the output of this state."""
        return e.compile_step([*self.step, self.output], [*self.names, *(n for n, _ in self.choices)])

    def next(self, state: State, choices: Sequence[int] | None = None) -> State:
        """The state after one more edge; choices default to zero."""
        values = choices if choices is not None else [0] * len(self.choices)
        return self.run(*state, *values)[:-1]

    def out(self, state: State) -> int:
        return self.run(*state, *[0] * len(self.choices))[-1]

    def moment(self) -> Moment:
        """The moment of a state at rest, as variables."""
        return {**self.inputs.moment(self.design.inputs), **{n: e.var(n, w) for n, w in self.variables}}

    def describe(self, state: State) -> dict[str, int]:
        """Register and clock values by name, in a state of this system."""
        if self.logs is not None:
            return {**self.logs.values(state[0]), self.clock: state[-1]}
        bits, codes = dict(self.words), dict(self.grays)
        out: dict[str, int] = {}
        for name, value in zip(self.names, state, strict=True):
            if name in codes:
                out[codes[name]] = value ^ value >> 1
            elif name in bits:
                out |= {bit: value >> place & 1 for place, bit in enumerate(bits[name])}
            else:
                out[name] = value
        return out


def start(design: Design, clock: str, inputs: Inputs) -> tuple[Moment, Moment]:
    """The two moments around an edge of the clock, from an arbitrary state at rest."""
    before: Moment = {r.name: e.var(r.name, r.width) for r in design.registers}
    before |= inputs.moment(design.inputs) | {clock: e.var(clock, 1)}
    now = before | {clock: e.bvnot(e.var(clock, 1))}
    return before, now


def build(
    design: Design, clock: str, inputs: Inputs, output: Expr, limit: int = 1, edge_wins: bool = False
) -> System:
    """The system with at most `limit` micro-steps a step; whether these suffice is for `settling` to prove."""
    before, now = start(design, clock, inputs)
    chain = unroll(design, before, now, limit, edge_wins)
    last = chain[-1]
    variables = (*((r.name, r.width) for r in design.registers), (clock, 1))
    (out,) = e.substitute([output], inputs.moment(design.inputs))
    if out.width != 1:
        raise InternalError("an output of several bits")
    return System(
        design=design,
        clock=clock,
        inputs=inputs,
        variables=variables,
        step=tuple(last[name] for name, _ in variables),
        output=out,
        settled=settled_when(design.registers, before),
        chain=tuple(chain),
    )


def change_inputs(design: Design, clock: str, moment: Moment, to: Inputs, limit: int) -> Moment:
    """The moment after the inputs change to `to` between two edges and all has settled."""
    now = {**moment, **to.moment(design.inputs)}
    return unroll(design, moment, now, limit)[-1]


def clock_edge(design: Design, clock: str, moment: Moment, limit: int) -> Moment:
    """The moment after one more edge of the clock, from any moment at rest."""
    now = {**moment, clock: e.bvnot(moment[clock])}
    return unroll(design, moment, now, limit)[-1]


def cone(system: System) -> System:
    """The system without the registers on which the output does not depend, now or later.

    Its power-up states are a superset: what a dropped register would have excluded is let in."""
    by_name = dict(zip(system.names, system.step, strict=True))
    kept = {system.clock}
    todo = [system.output]
    while todo:
        for v in e.variables([todo.pop()]):
            if v.name in by_name and v.name not in kept:
                kept.add(v.name)
                todo.append(by_name[v.name])
    if len(kept) == len(by_name):
        return system
    moment = system.moment()
    parts = [settled_when([r], moment) for r in system.design.registers if r.name in kept]
    parts = [part for part in parts if {v.name for v in e.variables([part])} <= kept]
    return replace(
        system,
        variables=tuple(pair for pair in system.variables if pair[0] in kept),
        step=tuple(by_name[name] for name in system.names if name in kept),
        settled=e.conj(parts),
    )


def project(system: System, state: State, onto: System) -> State:
    """A state of the whole system as a state of its cone, in the cone's coordinates (but for a matrix's)."""
    widths = dict(onto.variables)
    values = dict(zip(system.names, state, strict=True)) | system.describe(state)
    for name, register, low in onto.slices:
        values.setdefault(name, values.get(register, 0) >> low & ((1 << widths[name]) - 1))
    for name, register in onto.grays:
        code = number = values.get(register, 0)
        while code := code >> 1:
            number ^= code
        values.setdefault(name, number)
    for name, bits in onto.words:
        values.setdefault(name, sum(values.get(bit, 0) << place for place, bit in enumerate(bits)))
    return tuple(values[name] for name in onto.names)


def lies_at(machine: System, state: State, whole: System) -> Expr:
    """One bit over the whole system's variables: its registers are as a state of its cone has them."""
    widths = dict(whole.variables)
    parts = {name: (register, low) for name, register, low in machine.slices}
    here = []
    for name, value in machine.describe(state).items():
        register, low = parts.get(name, (name, 0))
        word = e.var(register, widths[register])
        if name in parts:
            word = e.extract(word, low + dict(machine.variables).get(name, 1) - 1, low)
        here.append(e.eq(word, e.const(value, word.width)))
    return e.conj(here)
