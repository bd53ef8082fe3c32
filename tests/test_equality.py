"""What has to hold for outputs to be equal, held against words written out, and against claims with a fault in them."""

from __future__ import annotations

import random
from collections.abc import Sequence
from dataclasses import replace
from math import gcd

import pytest
from small import CLOCK, design, flop, toggle

from prover import equality, lockstep, relations
from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.equality import Invariant, Shifts, first_difference, least_common, shifts
from prover.joint import Joint, build
from prover.pair import Pairing, match
from prover.path import Beat, Item, Path, Repeat
from prover.rhythm import Orbit


def written(path: Sequence[Item]) -> list[int]:
    """The output along a path, half-cycle by half-cycle."""
    out: list[int] = []
    for item in path:
        out += [item.level] if isinstance(item, Beat) else written(item.body) * item.times
    return out


def random_path(rng: random.Random, least: int, most: int, depth: int = 2) -> Path:
    out: list[Item] = []
    for _ in range(rng.randint(least, most)):
        if depth == 0 or rng.random() < 0.4:
            out.append(Beat((0,), rng.getrandbits(1)))
        else:
            out.append(Repeat(rng.randint(1, 6), (0,), random_path(rng, 1, 3, depth - 1)))
    return tuple(out)


def random_orbit(rng: random.Random) -> Orbit:
    return Orbit(random_path(rng, 0, 2), random_path(rng, 1, 3), (1,))


def rewritten(rng: random.Random, orbit: Orbit) -> Orbit:
    """The same output written otherwise, begun at another half-cycle of its loop; or with one level changed."""
    lead, loop = written(orbit.lead), written(orbit.loop)
    cut = rng.randint(0, 2 * len(loop))
    levels = lead + (loop * 4)[:cut]
    around = (loop * 6)[cut : cut + len(loop)] * rng.randint(1, 3)
    if rng.random() < 0.3:
        around[rng.randrange(len(around))] ^= 1
    return Orbit(beats(levels), beats(around), (1,))


def beats(levels: Sequence[int]) -> Path:
    return tuple(Beat((0,), level) for level in levels)


def test_the_first_difference_is_that_of_the_words_written_out() -> None:
    rng = random.Random(1)
    equal = 0
    for _ in range(1500):
        old = random_orbit(rng)
        new = rewritten(rng, old) if rng.random() < 0.6 else random_orbit(rng)
        lag = rng.choice([0, 0, 1, -1, 3, -4])
        # Two words with these periods that agree for so long agree for ever.
        loops = old.loop_half_cycles * new.loop_half_cycles // gcd(old.loop_half_cycles, new.loop_half_cycles)
        ends = min(old.lead_half_cycles + new.lead_half_cycles + loops, 4000) + 8
        a = written(old.lead) + written(old.loop) * (ends // old.loop_half_cycles + 6)
        b = written(new.lead) + written(new.loop) * (ends // new.loop_half_cycles + 6)
        begins = max(-lag, 0)
        wanted = next((t for t in range(begins, ends) if a[t] != b[t + lag]), None)
        assert first_difference(old, new, lag) == wanted
        equal += wanted is None
    assert equal > 200


def test_a_difference_beyond_any_unrolling_is_found() -> None:
    # 2001 · 2^40 half-cycles of the same; then one is low for two half-cycles more.
    pair = Repeat(1000, (0,), beats([0, 1]))
    long = Repeat(1 << 40, (0,), (pair, Beat((0,), 0)))
    old = Orbit((), (long,), (1,))
    new = Orbit((long, *beats([0, 0])), (long,), (1,))
    assert first_difference(old, new) == (2001 << 40) + 1
    assert first_difference(old, Orbit((long,), (long, long), (1,))) is None


def test_lags_are_those_at_which_the_words_are_equal() -> None:
    rng = random.Random(5)
    found = 0
    for _ in range(400):
        orbit = random_orbit(rng)
        begun = beats([rng.getrandbits(1) for _ in range(rng.randint(0, 6))])
        same = Orbit((*begun, *orbit.lead), orbit.loop * rng.randint(1, 2), (1,))
        late = same if rng.random() < 0.8 else random_orbit(rng)
        sets = shifts(orbit, late, Effort(60))
        assert sets is not None
        fitting = [lag for lag in range(60) if lag in sets]
        assert fitting == [lag for lag in range(60) if first_difference(orbit, late, lag) is None]
        found += bool(fitting)
    assert found > 200


def test_the_least_common_lag_is_that_of_enumeration() -> None:
    rng = random.Random(6)
    for _ in range(3000):
        sets = []
        for _ in range(rng.randint(1, 3)):
            lead, period = rng.randint(0, 6), rng.randint(1, 6)
            early = tuple(lag for lag in range(lead) if rng.random() < 0.3)
            sets.append(Shifts(early, lead, rng.choice([None, *range(period)]), period))
        wanted = next((lag for lag in range(200) if all(lag in each for each in sets)), None)
        assert least_common(sets) == wanted


# -- side by side ------------------------------------------------------------------------------------------


def down(width: int, limit: int) -> Design:
    """÷2·(limit + 1): a counter with synchronous reset that goes down from the limit, and a toggle."""
    count, out = e.var("left", width), e.var("tick", 1)
    first, zero = e.const(limit, width), e.const(0, width)
    reset = e.var("rst", 1)
    ends = e.eq(count, zero)
    following = e.ite(ends, first, e.bvsub(count, e.const(1, width)))
    return design(
        [
            flop("left", width, CLOCK, e.ite(reset, first, following)),
            flop("tick", 1, CLOCK, e.ite(reset, e.FALSE, e.ite(ends, e.bvnot(out), out))),
        ],
        out,
        ("clk", "rst"),
    )


def together(limit: int = 1000, lag: int = 0) -> Joint:
    return build(match(toggle(12, limit), down(12, limit), Pairing()), lag, Effort(60))


def test_an_invariant_holds_and_each_weaker_one_is_rejected() -> None:
    joint = together()
    claim = relations.invariant(joint, Effort(60))
    assert claim is not None
    assert equality.invariant_faults(joint, claim, Effort(60)) == []
    for number in range(len(claim.parts)):
        rest = (*claim.parts[:number], *claim.parts[number + 1 :])
        assert equality.invariant_faults(joint, replace(claim, parts=rest), Effort(60))
    # Nothing fulfils it, so it holds nowhere, not even at the start.
    assert equality.invariant_faults(joint, Invariant((e.FALSE,), 1), Effort(60))
    assert equality.invariant_faults(joint, Invariant((e.var("elsewhere", 1),), 1), Effort(60))


def test_an_invariant_of_other_dividers_is_rejected() -> None:
    claim = relations.invariant(together(1000), Effort(60))
    assert claim is not None
    assert equality.invariant_faults(together(1001), claim, Effort(60))


def test_a_set_of_states_holds_and_each_smaller_one_is_rejected() -> None:
    joint = together(3)
    states = lockstep.reach(joint, Effort(60), 10_000)
    assert isinstance(states, set)
    assert equality.reach_faults(joint, states, Effort(60)) == []
    formula = Invariant((equality.in_set(joint, states),), 1)
    assert equality.invariant_faults(joint, formula, Effort(60)) == []
    for state in states:
        assert equality.reach_faults(joint, states - {state}, Effort(60))
    assert equality.reach_faults(joint, states | {(0, 0, 1, 0, 0)}, Effort(60))


@pytest.mark.parametrize("lag", [1, -1, 3, -6])
def test_a_divider_is_not_itself_but_late(lag: int) -> None:
    pair = match(toggle(2, 2), toggle(2, 2), Pairing(lag=lag))
    found = lockstep.reach(build(pair, lag, Effort(60)), Effort(60), 100_000)
    assert isinstance(found, lockstep.Divergence)
    # By hand: ÷6 by a counter to 2 and a toggle rises at the third rising edge after release, which begins half-cycle 5
    # or 6, and turns every 6 half-cycles from then on.
    words = ([(t - rise) // 6 % 2 == 0 if t >= rise else False for t in range(60)] for rise in (5, 6))
    late = abs(lag)
    assert found.half_cycle == min(t for word in words for t in range(late, 60) if word[t] != word[t - late])
