"""The engines on random small machines, against plain enumeration: loops, worst recovery, lost states, orbits."""

from __future__ import annotations

import random
from fractions import Fraction
from itertools import product

import pytest
import small
from agreement import brute as enumeration
from machines import random_design

from prover import analyse, certificate, graph, orbit
from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.ports import recognise
from prover.rhythm import Rhythm
from prover.settling import settle
from prover.spec import Spec
from prover.system import State, System


def brute(system: System, period: int, high: int) -> enumeration.BruteResult[State]:
    """The machine enumerated through the integer evaluation of its step, from every settled state."""
    after: dict[State, State] = {}
    out: dict[State, int] = {}
    for state in product(*(range(1 << w) for _, w in system.variables)):
        values = dict(zip(system.names, state, strict=True))
        *step, level, rest = e.evaluate([*system.step, system.output, system.settled], values)
        if rest:
            after[state], out[state] = tuple(step), level
    return enumeration.analyse(after, out, period, high)


def analysed(design: Design, spec: Spec) -> Rhythm:
    return analyse.rhythm_of(recognise(design, spec), spec, Effort(60))


@pytest.mark.parametrize("seed", range(40))
def test_random_machines_agree_with_enumeration(seed: int) -> None:
    agrees_with_enumeration(seed, 8)


def agrees_with_enumeration(seed: int, bits: int) -> None:
    """Loops, stuck states, worst recovery and lost states of a random machine, against plain enumeration."""
    rng = random.Random(seed)
    design = random_design(rng, rng.randint(2, bits))
    rhythm = analysed(design, Spec(start="any"))
    system = rhythm.system
    if rhythm.settling.depth is None:
        # Enumeration of the micro-steps belongs to test_settling; here there is nothing to compare.
        assert rhythm.settling.unsettled is not None
        return
    # Claim what one of the loops does, so that the good states are not always none.
    waves = [loop.wave for loop in rhythm.loops if len(loop.wave.runs) == 2]
    period, high = (waves[0].period or 2, waves[0].high or 1) if waves else (6, 3)
    expected = brute(system, period, high)
    claim = Spec(ratio=Fraction(period, 2), high=high, start="any")
    found = analysed(design, claim)
    assert len(found.loops) == len(expected.loops)
    assert sum(loop.good for loop in found.loops) == len(expected.loops) - expected.false_loops
    assert {(loop.length, loop.wave.period, loop.wave.high) for loop in found.loops} == {
        (len(loop.states), loop.period_half_cycles, loop.high_half_cycles) for loop in expected.loops
    }
    assert found.never_stuck == (not expected.stuck)
    assert found.recovery is not None
    assert found.recovery.worst == expected.worst_half_cycles
    if expected.lost_states:
        assert found.recovery.lost is not None
        assert found.recovery.lost.start in expected.lost_states
    else:
        assert found.recovery.slowest is not None
        assert expected.recovery_half_cycles[found.recovery.slowest] == expected.worst_half_cycles


@pytest.mark.parametrize("seed", range(30))
def test_orbits_with_jumps_are_what_stepping_gives(seed: int) -> None:
    rng = random.Random(500 + seed)
    design = random_design(rng, rng.randint(4, 9))
    ports = recognise(design, Spec())
    system, settling = settle(design, ports.clock, ports.running, ports.output_value, Effort(60))
    if settling.depth is None:
        assert settling.unsettled is not None
        return
    state = tuple(rng.getrandbits(w) for _, w in system.variables)
    found = orbit.trace(system, state, Effort(60))
    assert found.closed
    at = state
    levels = [level for level, length in found.runs(rounds=2) for _ in range(length)]
    for t in range(found.lead_half_cycles + found.loop_half_cycles):
        assert found.state(t) == at
        assert levels[t] == system.out(at)
        at = system.next(at)
    assert at == found.state(found.lead_half_cycles)


def test_a_prescaler_that_ends_where_its_pace_is_looked_at_is_followed_rightly() -> None:
    # Decades below a wide counter: after 64 cycles the prescaler is at its last count, where four pairs of cycles have
    # gone on alike and the next does not.
    pre, left = e.var("pre", 4), e.var("left", 24)
    wraps = e.eq(pre, e.const(9, 4))
    registers = [
        small.flop("pre", 4, small.CLOCK, e.ite(wraps, e.const(0, 4), e.bvadd(pre, e.const(1, 4)))),
        small.flop("left", 24, small.CLOCK, e.ite(wraps, e.bvadd(left, e.const(-1, 24)), left)),
    ]
    ports = recognise(small.design(registers, e.extract(left, 0, 0)), Spec(start="any"))
    system, _ = settle(ports.design, ports.clock, ports.running, ports.output_value, Effort(60))
    for phase in range(10):
        run = orbit.trace(system, (phase, 12716364, 1), Effort(60), most=4000)
        assert certificate.orbit_faults(system, run, Effort(60)) == []


def test_a_graph_numbers_states_and_back() -> None:
    design = random_design(random.Random(7), 6)
    ports = recognise(design, Spec())
    system, _ = settle(design, ports.clock, ports.running, ports.output_value, Effort(60))
    states = graph.build(system, Effort(60))
    assert [states.number(states.state(n)) for n in range(128)] == list(range(128))
