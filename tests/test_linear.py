"""Linear shift registers: the published taps, their order, the lock-up state, and what is not linear."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction

import pytest
import small
from sympy import factorint

from prover import analyse, certificate, linear
from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.ports import recognise
from prover.rhythm import Rhythm
from prover.settling import settle
from prover.spec import Spec
from prover.system import State, System

# Maximal-length taps as the published tables of two makers give them (references 1.3).
TAPS = {
    13: (13, 4, 3, 1),
    16: (16, 15, 13, 4),
    18: (18, 11),
    20: (20, 17),
    24: (24, 23, 22, 17),
    27: (27, 5, 2, 1),
    32: (32, 22, 2, 1),
}


def register(n: int, taps: tuple[int, ...], xnor: bool = False) -> Design:
    """Stage i is bit i − 1; the new bit is the sum of the taps, into stage 1. The output decodes the state 5."""
    q = e.var("q", n)
    new = e.TRUE if xnor else e.FALSE
    for tap in taps:
        new = e.bvxor(new, e.extract(q, tap - 1, tap - 1))
    following = e.concat(e.extract(q, n - 2, 0), new)
    start = e.const(0 if xnor else 1, n)
    flop = small.flop("q", n, small.CLOCK, e.ite(small.RESET, start, following))
    return small.design([flop], e.eq(q, e.const(5, n)), ("clk", "rst"))


def machine(design: Design) -> System:
    ports = recognise(design, Spec())
    return settle(design, ports.clock, ports.running, ports.output_value, Effort(60))[0]


def analysed(design: Design, ratio: int) -> Rhythm:
    spec = Spec(ratio=Fraction(ratio), high=2)
    return analyse.rhythm_of(recognise(design, spec), spec, Effort(60))


@pytest.mark.parametrize("xnor", [False, True])
@pytest.mark.parametrize("n", sorted(TAPS))
def test_published_taps_have_the_full_period_and_one_lock_up_state(n: int, xnor: bool) -> None:
    rhythm = analysed(register(n, TAPS[n], xnor), 2**n - 1)
    waves = [orbit.wave() for orbit in rhythm.orbits]
    assert [(w.period, w.high) for w in waves if w] == [(2 * (2**n - 1), 2)] * 2
    assert rhythm.recovery is not None
    assert rhythm.recovery.lost is not None
    # The all-zeros state of the xor form, the all-ones state of the xnor form (references 1.3).
    lost = rhythm.system.describe(rhythm.recovery.lost.start)
    assert lost["q"] == (2**n - 1 if xnor else 0)


def test_states_and_numbers_go_into_one_another() -> None:
    system = machine(register(16, TAPS[16]))
    counted = linear.logs(system, Effort(60))
    assert counted is not None
    assert counted.logs is not None
    state: State = (5, 0)
    for number in range(2000):
        # Two edges are one step of the register; the number goes up by one.
        assert counted.logs.values(number)["q"] == state[0]
        assert counted.logs.number({"q": state[0]}) == number
        state = system.next(system.next(state))
    assert counted.logs.number({"q": 0}) == 2**16 - 1


def test_other_taps_are_no_full_order_and_other_steps_no_matrix() -> None:
    # x^16 + x^15 + 1 is not primitive: its period, walked, is shorter than 2^16 − 1.
    system = machine(register(16, (16, 15)))
    assert linear.logs(system, Effort(60)) is None
    state, steps = system.next(system.next((1, 0))), 1
    while state != (1, 0):
        state, steps = system.next(system.next(state)), steps + 1
    assert steps < 2**16 - 1
    assert linear.logs(machine(small.toggle(16, 999)), Effort(60)) is None


@pytest.mark.parametrize("n", range(2, 41))
def test_prime_factors_are_those_of_a_library(n: int) -> None:
    assert linear.prime_factors(2**n - 1) == sorted(factorint(2**n - 1))


def test_altered_matrices_are_rejected() -> None:
    system = machine(register(16, TAPS[16]))
    counted = linear.logs(system, Effort(60))
    assert counted is not None
    logs = counted.logs
    assert logs is not None
    assert certificate.linear_faults(system, logs, Effort(60)) == []
    for bit in range(0, 256, 7):
        columns = list(logs.columns)
        columns[bit % 16] ^= 1 << (bit // 16)
        assert certificate.linear_faults(system, replace(logs, columns=tuple(columns)), Effort(60))
    assert certificate.linear_faults(system, replace(logs, start=6), Effort(60))
    assert certificate.linear_faults(system, replace(logs, fixed=1), Effort(60))
    short = machine(register(16, (16, 15)))
    assert certificate.linear_faults(short, replace(logs, columns=_columns(16, (16, 15))), Effort(60))


def _columns(n: int, taps: tuple[int, ...]) -> tuple[int, ...]:
    return tuple((1 << (i + 1) if i + 1 < n else 0) | (1 if i + 1 in taps else 0) for i in range(n))
