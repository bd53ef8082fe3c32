"""A few dividers written as designs, for tests of what comes after the reader."""

from __future__ import annotations

from collections.abc import Sequence

from prover import expr as e
from prover.design import Design, Edge, Force, Register, Signal
from prover.errors import Where
from prover.expr import Expr

HERE = Where("small.v", 1)
CLOCK = e.var("clk", 1)
FALLING = e.bvnot(CLOCK)
RESET = e.var("rst", 1)


def flop(name: str, width: int, clock: Expr, data: Expr, clear: Expr | None = None) -> Register:
    """A flip-flop, cleared to zero while `clear` is 1."""
    forces = () if clear is None else (Force(clear, e.const(0, width), HERE),)
    return Register(name, width, "flip-flop", (Edge(clock, data),), forces, None, HERE)


def design(registers: Sequence[Register], output: Expr, inputs: Sequence[str] = ("clk",)) -> Design:
    """A design with those registers, one-bit inputs, and the output `out`."""
    signals = {"out": Signal("out", output, 0, 0, False, HERE)}
    made = Design(
        "small", dict.fromkeys(inputs, 1), ("out",), tuple(registers), signals, {}, ("small.v",), "0"
    )
    made.sanity_check()
    return made


def toggle(width: int, limit: int, at_least: bool = False) -> Design:
    """÷2·(limit + 1): a counter with synchronous reset that wraps at `limit` and toggles the output."""
    count, out = e.var("count", width), e.var("tick", 1)
    last = e.const(limit, width)
    wraps = e.bvule(last, count) if at_least else e.eq(count, last)
    following = e.ite(wraps, e.const(0, width), e.bvadd(count, e.const(1, width)))
    return design(
        [
            flop("count", width, CLOCK, e.ite(RESET, e.const(0, width), following)),
            flop("tick", 1, CLOCK, e.ite(RESET, e.FALSE, e.ite(wraps, e.bvnot(out), out))),
        ],
        out,
        ("clk", "rst"),
    )


def odd(width: int, ratio: int) -> Design:
    """÷ratio at 50 %: a counter on the rising edge, its upper half resampled on the falling one, OR-ed."""
    count, late = e.var("count", width), e.var("late", 1)
    wraps = e.bvule(e.const(ratio - 1, width), count)
    upper = e.bvule(e.const((ratio + 1) // 2, width), count)
    following = e.ite(wraps, e.const(0, width), e.bvadd(count, e.const(1, width)))
    return design(
        [
            flop("count", width, CLOCK, e.ite(RESET, e.const(0, width), following)),
            flop("late", 1, FALLING, upper),
        ],
        e.bvor(upper, late),
        ("clk", "rst"),
    )


def self_clearing(stages: int) -> Design:
    """÷(2^stages − 1): toggle stages that ripple, cleared by the decode of all ones; the top one resampled."""
    bits = [e.var(f"q{i}", 1) for i in range(stages)]
    clear = e.conj(bits)
    registers = [flop("q0", 1, CLOCK, e.bvnot(bits[0]), clear)]
    for i in range(1, stages):
        registers.append(flop(f"q{i}", 1, e.bvnot(bits[i - 1]), e.bvnot(bits[i]), clear))
    registers.append(flop("late", 1, FALLING, bits[-1]))
    return design(registers, e.bvor(bits[-1], e.var("late", 1)))


def twisted_ring(stages: int) -> Design:
    """An n-stage shift register that feeds back the complement of its last stage; the first stage is the output."""
    q = [e.var(f"q{i}", 1) for i in range(stages)]
    registers = [flop(f"q{i}", 1, CLOCK, q[i - 1] if i else e.bvnot(q[-1])) for i in range(stages)]
    return design(registers, q[0])


def cascade(width: int, depth: int, limit: int) -> Design:
    """`depth` counters of limit + 1 each, every one counting when all before it wrap; the output is high in the
    last one's upper half."""
    counts = [e.var(f"count{i}", width) for i in range(depth)]
    last = e.const(limit, width)
    ticks = e.TRUE
    registers = []
    for i, count in enumerate(counts):
        wraps = e.eq(count, last)
        following = e.ite(wraps, e.const(0, width), e.bvadd(count, e.const(1, width)))
        registers.append(
            flop(f"count{i}", width, CLOCK, e.ite(RESET, e.const(0, width), e.ite(ticks, following, count)))
        )
        ticks = e.bvand(ticks, wraps)
    return design(registers, e.bvult(e.const(limit // 2, width), counts[-1]), ("clk", "rst"))


def ripple(stages: int) -> Design:
    """÷2^stages: toggle stages, each clocked by the falling edge of the one before; the last is the output."""
    bits = [e.var(f"q[{i}]", 1) for i in range(stages)]
    clocks = [CLOCK, *(e.bvnot(bit) for bit in bits)]
    registers = [flop(f"q[{i}]", 1, clocks[i], e.bvnot(bit)) for i, bit in enumerate(bits)]
    return design(registers, bits[-1])
