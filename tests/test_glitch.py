"""Glitches: verdicts against all orders of arrival, and what the findings say."""

from __future__ import annotations

import random
from collections.abc import Mapping
from fractions import Fraction
from itertools import product

import pytest
from agreement import brute as enumeration
from machines import random_design
from orders import moments, most_changes, most_changes_in_any_order

from properties import glitch_free
from prover import analyse
from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.ports import recognise
from prover.rhythm import Rhythm
from prover.spec import Spec


def analysed(design: Design, spec: Spec) -> Rhythm:
    return analyse.rhythm_of(recognise(design, spec), spec, Effort(60))


def worst_changes(design: Design, rhythm: Rhythm, period: int, high: int) -> tuple[int, int] | None:
    """The most changes of the output in one half-cycle that starts in a good state: in any order within a micro-step,
    and in any order at all. None if no state is good."""
    system = rhythm.system
    output = design.signals["out"].value
    paths = {}
    levels = {}
    for state in product(*(range(1 << w) for _, w in system.variables)):
        values = dict(zip(system.names, state, strict=True))
        (rest,) = e.evaluate([system.settled], values)
        if rest:
            paths[state] = moments(design, "clk", values)
            (levels[state],) = e.evaluate([output], values)
    after = {state: tuple(steps[-1][name] for name in system.names) for state, steps in paths.items()}
    good = enumeration.good_phases(after, levels, period, high)
    seen = e.compile_step([output], system.names)

    def level(values: Mapping[str, int]) -> int:
        return seen(*(values[name] for name in system.names))[0]

    counts = [(most_changes(level, paths[s]), most_changes_in_any_order(level, paths[s])) for s in good]
    return (max(a for a, _ in counts), max(b for _, b in counts)) if counts else None


@pytest.mark.parametrize("seed", range(60))
def test_random_machines_pulse_where_some_order_of_arrival_shows_it(seed: int) -> None:
    rng = random.Random(seed)
    design = random_design(rng, rng.randint(2, 6))
    rhythm = analysed(design, Spec(start="any"))
    if rhythm.settling.depth is None:
        return
    waves = [loop.wave for loop in rhythm.loops if len(loop.wave.runs) == 2]
    if not waves:
        return
    period, high = waves[0].period or 2, waves[0].high or 1
    claim = Spec(ratio=Fraction(period, 2), high=high, start="any")
    found = glitch_free.judge(analysed(design, claim), claim)
    expected = worst_changes(design, rhythm, period, high)
    assert expected is not None
    in_order, anyhow = expected
    assert (found.verdict == "refuted") == (in_order > 1)
    assert found.verdict != "open"
    if anyhow > 1:
        assert found.verdict == "refuted" or found.obligations
