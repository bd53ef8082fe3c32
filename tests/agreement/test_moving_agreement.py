"""Inputs that move: the engines against plain enumeration on random machines. Needs no simulator.

Verdict, length of the shortest run that breaks a claim, half-cycles until the ratio is back and until the output parks
are those that `moving_brute` finds by going through all runs.
"""

from __future__ import annotations

import os
import random
from collections import Counter

import pytest
from agreement.moving_brute import Circuit, Found, Nominal, enumerate_runs, longest_way_back, resting
from moving_machines import gated, programmable, wild

from prover import expr as e
from prover import moves
from prover.design import Design
from prover.effort import Effort
from prover.expr import Expr
from prover.moves import Moves, Question
from prover.observer import Nominal as Words
from prover.ports import Ports

COUNT = int(os.environ.get("SUBHARMONIC_MACHINES", "100"))
"""Machines in each of ten batches."""


def waves(circuit: Circuit) -> Nominal:
    """Half-cycles low and high of the wave that each value leads to from both starts; values without one high run a
    period are left out. What is claimed of a random machine is what it does where nothing moves."""
    out = {}
    for value in circuit.values:
        found: set[tuple[int, int] | None] = set()
        for start in circuit.starts(value):
            step, output = circuit.held([start], value)
            path = [start]
            while path[-1] not in path[:-1]:
                path.append(step[path[-1]])
            loop = [output[state] for state in path[path.index(path[-1]) : -1]]
            rises = [i for i in range(len(loop)) if loop[i] and not loop[i - 1]]
            if not rises:
                found.add(None)
                continue
            turned = loop[rises[0] :] + loop[: rises[0]]
            size = next(n for n in range(1, len(loop) + 1) if turned == turned[:n] * (len(loop) // n))
            high = sum(turned[:size])
            found.add((size - high, high) if turned[:high] == [1] * high else None)
        (only, *others) = found
        if only is not None and not others:
            out[value] = only
    return out


def words(name: str, width: int, nominal: Nominal) -> Words:
    """The same as words of the prover."""
    moved = e.var(name, width)

    def table(place: int) -> Expr:
        out = e.const(0, 8)
        for value, lengths in nominal.items():
            out = e.ite(e.eq(moved, e.const(value, width)), e.const(lengths[place], 8), out)
        return out

    domain = e.disj(e.eq(moved, e.const(value, width)) for value in nominal)
    return Words(table(1), table(0), domain)


def ask(design: Design, name: str, claimed: Words, varies: bool) -> Moves:
    """What the prover finds out."""
    signal = design.signals["out"]
    ports = Ports(design, "clk", None, "out", signal.value, {}, signal.value, signal.where)
    question = Question((name,), (), {}, claimed, varies, "initial")
    return moves.answer(ports, question, Effort(60))


def agrees(seed: int) -> str:
    """Compare on one random machine; what came of it."""
    rng = random.Random(seed)
    varies = rng.random() < 0.6
    name = "div" if varies else "en"
    make = rng.randrange(10)
    if make < 8:
        design = programmable(rng) if varies else gated(rng)
    else:
        design = wild(rng, name, rng.randint(1, 2) if varies else 1)
    try:
        circuit = Circuit(design, name, "out")
        nominal = waves(circuit)
    except AssertionError:
        return "unsettled"
    if varies:
        return changes_ratio(design, circuit, nominal)
    return enables(design, circuit, nominal)


def same_break(found: Moves, brute: Found) -> str:
    assert found.trace is not None, found.open
    assert (found.trace.half_cycles, found.trace.rests[-1].moved) == brute.broken
    assert found.trace.on_the_way == brute.within
    return "pulsing" if brute.within else "refuted"


def changes_ratio(design: Design, circuit: Circuit, nominal: Nominal) -> str:
    if not nominal:
        return "no wave"
    found = ask(design, "div", words("div", design.inputs["div"], nominal), True)
    try:
        brute = enumerate_runs(circuit, nominal, long_too=True)
    except AssertionError:
        assert "settle" in found.open
        return "unsettled"
    if brute.broken is not None and not brute.within:
        return f"ratio-change {same_break(found, brute)}"
    back = [
        longest_way_back(circuit, brute.reached[v], v, *lengths)
        for v, lengths in nominal.items()
        if brute.reached[v]
    ]
    if None in back:
        assert found.trace is not None
        return "ratio-change lost"
    if brute.within:
        return f"ratio-change {same_break(found, brute)}"
    assert found.proved, found.open
    assert found.back == max(time for time in back if time is not None)
    return "ratio-change proved"


def enables(design: Design, circuit: Circuit, nominal: Nominal) -> str:
    if not nominal:
        return "no wave"
    active = 1 if 1 in nominal else 0
    low, high = nominal[active]
    both = {0: (low, high), 1: (low, high)}
    claimed = Words(e.const(high, 8), e.const(low, 8), e.TRUE)
    found = ask(design, "en", claimed, False)
    try:
        brute = enumerate_runs(circuit, both, long_too=False)
    except AssertionError:
        assert "settle" in found.open
        return "unsettled"
    if brute.broken is not None and not brute.within:
        return f"enable {same_break(found, brute)}"
    running = [
        value
        for value in (0, 1)
        if longest_way_back(circuit, set(circuit.starts(value)), value, low, high) is not None
    ]
    back = [longest_way_back(circuit, brute.reached[value], value, low, high) for value in running]
    parked = [resting(circuit, brute.reached[value], value) for value in (0, 1) if value not in running]
    if None in back or None in parked:
        assert found.trace is not None
        return "enable lost"
    if brute.within:
        return f"enable {same_break(found, brute)}"
    assert found.proved, found.open
    assert found.back == max(time for time in back if time is not None)
    levels = {level for each in parked if each for level in each[0]}
    assert set(found.parked) == levels
    assert found.still == (max(each[1] for each in parked if each) if parked else None)
    return "enable proved"


@pytest.mark.parametrize("batch", range(10))
def test_the_search_agrees_with_enumeration(batch: int) -> None:
    came = Counter(agrees(seed) for seed in range(batch * COUNT, (batch + 1) * COUNT))
    for each in ("ratio-change proved", "ratio-change refuted", "enable proved", "enable refuted"):
        assert came[each] >= COUNT // 50, came
    # With sound clock and clear nets and outputs, a pulse between two rests is rarer.
    assert came["ratio-change pulsing"] + came["enable pulsing"] > 0, came
