"""The cover engine forced on machines small enough for their graph, and held against it."""

from __future__ import annotations

import random

from machines import random_design

from prover import certificate, graph, wide
from prover.effort import Effort
from prover.ports import recognise
from prover.rhythm import Goal
from prover.settling import settle
from prover.spec import Spec
from prover.system import System


def compared(seed: int, bits: int) -> str:
    """Compare on one random machine; what came of it: "proved", "lost", "open", "unsettled" or "no goal".

    Raises AssertionError where the two engines contradict each other."""
    rng = random.Random(seed)
    design = random_design(rng, rng.randint(2, bits))
    ports = recognise(design, Spec())
    system, settling = settle(design, ports.clock, ports.running, ports.output_value, Effort(20))
    if settling.depth is None:
        return "unsettled"
    states = graph.build(system, Effort(20))
    if not states.start.any():
        return "unsettled"
    found = graph.basins(states, Effort(20), None)
    waves = [loop.wave for loop in found.loops if len(loop.wave.runs) == 2]
    if not waves:
        return "no goal"
    return _judged(system, states, Goal(waves[0].period or 0, waves[0].high or 0))


def _judged(system: System, states: graph.Graph, goal: Goal) -> str:
    found = graph.basins(states, Effort(20), goal)
    table = graph.ranks(states, found, goal)
    lost = bool((states.start & (table.rank < 0)).any())
    worst = int(table.rank[states.start].max())
    cover = wide.cover(system, goal, system.settled, [], Effort(20))
    broken = [line for line in cover.lines if line.recovery is None]
    for line in cover.lines:
        # What a line says of its start is what the graph says.
        rank = int(table.rank[states.number(line.orbit.start)])
        assert line.recovery == (None if rank < 0 else rank), (line.orbit.start, line.recovery, rank)
    if broken:
        assert lost
        return "lost"
    if cover.worst is None:
        return "open"
    assert not lost
    assert not certificate.stage_faults(system, cover.claims, cover.worst, Effort(20))
    assert cover.worst >= worst
    if cover.slowest is not None:
        assert cover.worst == worst
        assert int(table.rank[states.number(cover.slowest)]) == worst
    return "proved"
