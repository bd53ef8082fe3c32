"""Random small machines with an input that moves: programmable dividers with something put wrong, and others."""

from __future__ import annotations

import random

from machines import random_expression
from small import HERE

from prover import expr as e
from prover.design import Design, Edge, Force, Register, Signal
from prover.expr import Expr

CLOCK = e.var("clk", 1)


def _design(registers: list[Register], output: Expr, inputs: dict[str, int]) -> Design:
    signals = {"out": Signal("out", output, 0, 0, False, HERE)}
    made = Design("random", {"clk": 1, **inputs}, ("out",), tuple(registers), signals, {}, ("random.v",), "0")
    made.sanity_check()
    return made


def _flop(rng: random.Random, name: str, width: int, data: Expr, falling: bool = False) -> Register:
    clock = e.bvnot(CLOCK) if falling else CLOCK
    return Register(name, width, "flip-flop", (Edge(clock, data),), (), rng.choice([0, 0, 0, 1]), HERE)


def _latch(name: str, when: Expr, value: Expr) -> Register:
    return Register(name, value.width, "latch", (), (Force(when, value, HERE),), 0, HERE)


def programmable(rng: random.Random) -> Design:
    """A counter that wraps at what `div` says, used at once or by way of a register; its output a toggle or a compare,
    in a register or not."""
    width = rng.randint(1, 2)
    div, count, tick = e.var("div", width), e.var("count", width), e.var("tick", 1)
    registers = []
    limit = div
    wraps_where = rng.randrange(4)
    if wraps_where == 1:
        limit = e.var("limit", width)
    wraps = rng.choice([e.eq(count, limit), e.bvule(limit, count), e.bvule(limit, count)])
    following = e.ite(wraps, e.const(0, width), e.bvadd(count, e.const(1, width)))
    if rng.random() < 0.15:
        # Counting down.
        wraps = e.eq(count, e.const(0, width))
        following = e.ite(wraps, limit, e.bvadd(count, e.const(-1, width)))
    registers.append(_flop(rng, "count", width, following, falling=rng.random() < 0.1))
    if wraps_where == 1:
        loads = rng.choice([wraps, wraps, e.bvand(wraps, tick), e.TRUE])
        registers.append(_flop(rng, "limit", width, e.ite(loads, div, limit)))
    kind = rng.randrange(4)
    toggle = e.ite(wraps, e.bvnot(tick), tick)
    half = e.bvult(e.const(0, width), count) if rng.random() < 0.5 else e.bvult(count, limit)
    data = toggle if kind < 2 or wraps_where == 1 else half
    if kind == 2 and rng.random() < 0.3:
        register = _flop(rng, "tick", 1, data)
        clear = Force(random_expression(rng, [div, count], 1, 1), e.const(0, 1), HERE)
        registers.append(Register("tick", 1, "flip-flop", register.edges, (clear,), 0, HERE))
    else:
        registers.append(_flop(rng, "tick", 1, data))
    output: Expr = tick
    if kind == 3 and rng.random() < 0.5:
        output = half
    if rng.random() < 0.2:
        registers.append(_flop(rng, "late", 1, tick, falling=rng.random() < 0.6))
        output = rng.choice([e.bvor, e.bvand])(tick, e.var("late", 1))
    return _design(registers, output, {"div": width})


def gated(rng: random.Random) -> Design:
    """A divider by a small number that `en` gates: by a latch, a flip-flop on either edge, or nothing at all."""
    width = rng.randint(1, 2)
    en, count, tick = e.var("en", 1), e.var("count", width), e.var("tick", 1)
    last = e.const(rng.randrange(1 << width), width)
    wraps = e.eq(count, last)
    following = e.ite(wraps, e.const(0, width), e.bvadd(count, e.const(1, width)))
    toggled = e.ite(wraps, e.bvnot(tick), tick)
    kind = rng.randrange(7)
    if kind == 0:
        following, toggled = e.ite(en, following, count), e.ite(en, toggled, tick)
    if kind == 1:
        following, toggled = e.ite(en, following, e.const(0, width)), e.ite(en, toggled, e.const(0, 1))
    if kind == 2:
        # Stops only where it wraps.
        stays = e.bvand(e.bvnot(en), e.bvnot(tick))
        toggled = e.ite(stays, tick, toggled)
    registers = [_flop(rng, "count", width, following), _flop(rng, "tick", 1, toggled)]
    output: Expr = tick
    if kind >= 3:
        gate = en
        if kind == 4:
            gate = e.var("gate", 1)
            registers.append(_latch("gate", rng.choice([e.bvnot(tick), tick, e.bvnot(CLOCK)]), en))
        if kind == 5:
            gate = e.var("gate", 1)
            registers.append(_flop(rng, "gate", 1, en, falling=rng.random() < 0.6))
        if kind == 6:
            gate = e.var("gate", 1)
            edge = Edge(rng.choice([e.bvnot(tick), tick]), en)
            registers.append(Register("gate", 1, "flip-flop", (edge,), (), rng.choice([0, 1]), HERE))
        output = rng.choice([e.bvand, e.bvand, e.bvor])(rng.choice([tick, tick, CLOCK]), gate)
    return _design(registers, output, {"en": 1})


def wild(rng: random.Random, name: str, width: int) -> Design:
    """Anything at all."""
    moved = e.var(name, width)
    widths = [rng.randint(1, 2) for _ in range(rng.randint(1, 2))]
    held = [e.var(f"r{i}", w) for i, w in enumerate(widths)]
    registers = []
    for i, w in enumerate(widths):
        data = random_expression(rng, [*held, moved], w, 2)
        if i == 0:
            data = e.ite(
                e.bvule(moved if w == width else e.const(1, w), held[0]),
                e.const(0, w),
                e.bvadd(held[0], e.const(1, w)),
            )
        made = _flop(rng, f"r{i}", w, data, falling=rng.random() < 0.3)
        if rng.random() < 0.15:
            clear = Force(random_expression(rng, [*held, moved], 1, 1), e.const(0, w), HERE)
            made = Register(made.name, w, "flip-flop", made.edges, (clear,), made.initial, HERE)
        registers.append(made)
    output = random_expression(rng, [*held, *([moved, CLOCK] if rng.random() < 0.2 else [])], 1, 2)
    return _design(registers, output, {name: width})
