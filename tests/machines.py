"""Random expressions and random small machines for the tests, from a seeded generator."""

from __future__ import annotations

import random
from collections.abc import Sequence
from dataclasses import replace

from prover import expr as e
from prover.design import Design, Edge, Force, Register, Signal
from prover.errors import Where
from prover.expr import Expr

HERE = Where("random.v", 1)
SAME = [e.bvand, e.bvor, e.bvxor, e.bvadd, e.bvsub, e.bvmul]
OTHER = ["bvudiv", "bvurem", "bvsdiv", "bvsrem", "bvshl", "bvlshr", "bvashr"]


def random_expression(rng: random.Random, leaves: Sequence[Expr], width: int, depth: int) -> Expr:
    """An expression of the given width over the leaves, every operator among them."""

    def make(wanted: int, left: int) -> Expr:
        if left == 0 or rng.random() < 0.1:
            if rng.random() < 0.25:
                return e.const(rng.getrandbits(wanted), wanted)
            leaf = rng.choice(leaves)
            return e.resize(leaf, wanted, rng.random() < 0.5)
        kind = rng.randrange(9)
        if kind == 0:
            return rng.choice([e.bvnot, e.bvneg])(make(wanted, left - 1))
        if kind in (1, 2):
            operator = rng.choice(SAME)
            return operator(make(wanted, left - 1), make(wanted, left - 1))
        if kind == 3:
            return e.binary(rng.choice(OTHER), make(wanted, left - 1), make(wanted, left - 1))
        if kind == 4:
            return e.ite(make(1, left - 1), make(wanted, left - 1), make(wanted, left - 1))
        if kind == 5 and wanted == 1:
            inner = rng.randint(1, 9)
            compare = rng.choice([e.eq, e.bvult, e.bvslt, e.bvule, e.bvsle])
            return compare(make(inner, left - 1), make(inner, left - 1))
        if kind == 6 and wanted > 1:
            below = rng.randint(1, wanted - 1)
            return e.concat(make(wanted - below, left - 1), make(below, left - 1))
        if kind == 7:
            low, more = rng.randint(0, 3), rng.randint(0, 3)
            return e.extract(make(wanted + low + more, left - 1), low + wanted - 1, low)
        if kind == 8 and wanted > 1:
            inner = rng.randint(1, wanted)
            return rng.choice([e.zero_extend, e.sign_extend])(make(inner, left - 1), wanted - inner)
        return make(wanted, left - 1)

    return make(width, depth)


def random_design(rng: random.Random, bits: int) -> Design:
    """A closed divider of that many register bits: rising and falling edges, ripple clocks, asynchronous clears."""
    widths: list[int] = []
    while sum(widths) < bits:
        widths.append(min(rng.randint(1, 4), bits - sum(widths)))
    registers = [e.var(f"r{i}", w) for i, w in enumerate(widths)]
    clock = e.var("clk", 1)
    made = []
    for i, (held, width) in enumerate(zip(registers, widths, strict=True)):
        net = clock
        if i and rng.random() < 0.3:
            earlier = registers[rng.randrange(i)]
            bit = rng.randrange(earlier.width)
            net = e.extract(earlier, bit, bit)
        if rng.random() < 0.4:
            net = e.bvnot(net)
        data = _data(rng, held, registers, width)
        forces: tuple[Force, ...] = ()
        if rng.random() < 0.15:
            forces = (
                Force(random_expression(rng, registers, 1, 2), e.const(rng.getrandbits(width), width), HERE),
            )
        made.append(Register(f"r{i}", width, "flip-flop", (Edge(net, data),), forces, None, HERE))
    output = random_expression(rng, [*registers, clock], 1, 2)
    signals = {"out": Signal("out", output, 0, 0, False, HERE)}
    return Design("random", {"clk": 1}, ("out",), tuple(made), signals, {}, ("random.v",), "0")


def resettable(rng: random.Random, design: Design) -> Design:
    """The design with an input `rst`, which each register obeys at once, with its clock, or not at all."""
    reset = e.var("rst", 1)
    made = []
    for register in design.registers:
        value = e.const(rng.getrandbits(register.width), register.width)
        kind = rng.randrange(8)
        if kind < 4:
            edges = tuple(replace(edge, data=e.ite(reset, value, edge.data)) for edge in register.edges)
            register = replace(register, edges=edges)
        elif kind < 7:
            register = replace(register, forces=(Force(reset, value, HERE), *register.forces))
        made.append(register)
    return replace(design, inputs={**design.inputs, "rst": 1}, registers=tuple(made))


def _data(rng: random.Random, held: Expr, registers: Sequence[Expr], width: int) -> Expr:
    kind = rng.randrange(4)
    if kind == 0:
        return random_expression(rng, registers, width, 3)
    if kind == 1:
        return e.bvnot(held)
    limit = e.const(rng.getrandbits(width), width)
    reached = rng.choice([e.eq(held, limit), e.bvule(limit, held)])
    counted = e.ite(reached, e.const(0, width), e.bvadd(held, e.const(rng.choice([1, -1]), width)))
    if kind == 2:
        return counted
    return e.ite(random_expression(rng, registers, 1, 2), counted, held)
