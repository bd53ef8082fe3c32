"""Certificates: right ones are accepted, and every wrong number in one is found."""

from __future__ import annotations

import random
from dataclasses import replace

import numpy as np
import pytest
import small
import z3

from prover import certificate, graph, orbit, path
from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.path import Beat, Item, Repeat
from prover.ports import recognise
from prover.rhythm import Goal, Orbit
from prover.settling import settle
from prover.spec import Spec
from prover.system import State, System


def system_of(design: Design) -> System:
    ports = recognise(design, Spec())
    return settle(design, ports.clock, ports.running, ports.output_value, Effort(60))[0]


def traced(system: System, start: State) -> Orbit:
    found = orbit.trace(system, start, Effort(60))
    assert certificate.orbit_faults(system, found, Effort(60)) == []
    return found


def test_orbits_of_any_ratio_have_few_items_and_pass() -> None:
    for limit in (4, 300, 25_000_000 - 1, 2**31 - 1):
        found = traced(system_of(small.toggle(32, limit)), (0, 0, 0))
        assert found.loop_half_cycles == 4 * (limit + 1)
        assert len(found.loop) < 80


@pytest.mark.parametrize("depth", [2, 3])
def test_cascades_cost_no_more_than_their_depth(depth: int) -> None:
    found = traced(system_of(small.cascade(16, depth, 49_999)), (0,) * (depth + 1))
    assert found.loop_half_cycles == 2 * 50_000**depth
    assert len(list(path.beats(found.loop))) < 3000


def test_obligations_are_scripts_that_a_solver_refutes() -> None:
    system = system_of(small.toggle(26, 25_000_000 - 1))
    found = traced(system, (0, 0, 0))
    scripts = [o.script() for o in certificate.orbit_obligations(system, found)]
    assert scripts
    for script in scripts:
        assert script.count("(check-sat)") == 1
        solver = z3.Solver()
        solver.from_string(script)
        assert solver.check() == z3.unsat


def altered(item: Item, widths: tuple[int, ...], rng: random.Random) -> Item:
    """The item with one number changed."""

    def flipped(state: State) -> State:
        values = list(state)
        i = rng.randrange(len(values))
        values[i] ^= 1 << rng.randrange(widths[i])
        return tuple(values)

    if isinstance(item, Beat):
        if rng.random() < 0.5:
            return Beat(item.state, 1 - item.level)
        return Beat(flipped(item.state), item.level)
    part = rng.choice(["times", "stride", "body"])
    if part == "times":
        return Repeat(item.times + rng.choice([-1, 1, 7]), item.stride, item.body)
    if part == "stride":
        return Repeat(item.times, flipped(item.stride), item.body)
    at = rng.randrange(len(item.body))
    inner = altered(item.body[at], widths, rng)
    return Repeat(item.times, item.stride, (*item.body[:at], inner, *item.body[at + 1 :]))


@pytest.mark.parametrize("name", ["toggle", "cascade"])
def test_every_altered_orbit_is_rejected(name: str) -> None:
    design = small.toggle(16, 999) if name == "toggle" else small.cascade(8, 2, 199)
    system = system_of(design)
    found = traced(system, (0, 0, 0))
    rng = random.Random(3)
    for _ in range(100):
        at = rng.randrange(len(found.loop))
        loop = (*found.loop[:at], altered(found.loop[at], found.widths, rng), *found.loop[at + 1 :])
        assert certificate.orbit_faults(system, replace(found, loop=loop), Effort(60)), at
    assert certificate.orbit_faults(system, replace(found, loop=found.loop[1:]), Effort(60))
    assert certificate.orbit_faults(system, replace(found, loop=found.loop[:-1]), Effort(60))


def test_altered_phases_and_ranks_are_rejected() -> None:
    system = system_of(small.odd(3, 5))
    states = graph.build(system, Effort(60))
    found = graph.basins(states, Effort(60), Goal(10, 5))
    table = graph.ranks(states, found, Goal(10, 5))
    assert certificate.rank_faults(system, table.phase, table.rank, Goal(10, 5), Effort(60)) == []
    rng = random.Random(4)
    for _ in range(100):
        phase, rank = table.phase.copy(), table.rank.copy()
        target = rng.choice([phase, rank])
        at = rng.randrange(len(target))
        # A rank that is merely too high for a state nothing leads to is still a true bound, so lower it.
        target[at] = (phase[at] + rng.randint(1, 9)) % 10 if target is phase else max(rank[at] - 1, -1)
        if np.array_equal(phase, table.phase) and np.array_equal(rank, table.rank):
            continue
        assert certificate.rank_faults(system, phase, rank, Goal(10, 5), Effort(60))
    assert certificate.rank_faults(system, table.phase, table.rank, Goal(10, 4), Effort(60))


def test_what_x_stands_for_may_change_from_one_half_cycle_to_the_next() -> None:
    """From 0, x = 1 leads by 1 and x = 0 by 2 to the home state 3, where it stays. But x = 1 and then x = 0 leads from
    0 by 1 back to 0: there is no time by which every state is home."""
    state, x = e.var("state", 2), e.var("?x", 1)
    steps = [(1, 2), (3, 0), (0, 3), (3, 3)]
    data = e.const(3, 2)
    for at, (high, low) in enumerate(steps[:3]):
        taken = e.ite(x, e.const(high, 2), e.const(low, 2))
        data = e.ite(e.eq(state, e.const(at, 2)), taken, data)
    system = system_of(small.design([small.flop("state", 2, small.CLOCK, data)], e.extract(state, 0, 0)))
    assert system.choices
    home = [(3, 0), (3, 1)]
    for half_cycles in (1, 5, 9):
        for level in (0, 1):
            goal = certificate.reset_goal(system, level, half_cycles, home)
            assert not certificate.discharge(goal, Effort(60))
    everywhere = [(value, level) for value in range(4) for level in (0, 1)]
    assert certificate.discharge(certificate.reset_goal(system, 0, 5, everywhere), Effort(60))
