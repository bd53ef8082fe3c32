"""The cover engine: forced on small random machines against their graph, and wide machines with known figures."""

from __future__ import annotations

from collections import Counter
from fractions import Fraction

import pytest
import small
from forced import compared

from prover import analyse, certificate, wide
from prover import expr as e
from prover.design import Design
from prover.effort import Effort
from prover.ports import recognise
from prover.rhythm import Rhythm
from prover.spec import Spec


def test_forced_on_small_machines_it_says_what_the_graph_says() -> None:
    came = Counter(compared(seed, 7) for seed in range(60))
    assert came["proved"] >= 15
    assert came["lost"] >= 3
    assert came["open"] <= 2


def analysed(design: Design, ratio: int, high: int | None = None) -> Rhythm:
    spec = Spec(ratio=Fraction(ratio), high=high)
    return analyse.rhythm_of(recognise(design, spec), spec, Effort(60))


def test_an_exact_compare_overshoots_to_the_end_of_the_word() -> None:
    # From 25 000 000 the counter runs on to 2^32: (2^32 − 25 000 000) input cycles.
    rhythm = analysed(small.toggle(32, 25_000_000 - 1), 50_000_000)
    assert rhythm.recovery is not None
    assert (rhythm.recovery.worst, rhythm.recovery.exact) == (2 * (2**32 - 25_000_000), True)
    assert rhythm.recovery.slowest is not None
    described = rhythm.system.describe(rhythm.recovery.slowest)
    assert (described["count"], described["clk"]) == (25_000_000, 1)
    assert rhythm.complete
    assert rhythm.never_stuck


@pytest.mark.parametrize("width", [8, 11, 14])
def test_the_same_compare_in_few_bits_agrees_with_the_graph(width: int) -> None:
    limit = 5 * 2 ** (width - 4)
    rhythm = analysed(small.toggle(width, limit - 1), 2 * limit)
    assert rhythm.recovery is not None
    assert rhythm.recovery.worst == 2 * (2**width - limit)


def test_a_compare_that_nothing_overshoots_needs_next_to_nothing() -> None:
    rhythm = analysed(small.toggle(32, 25_000_000 - 1, at_least=True), 50_000_000)
    assert rhythm.recovery is not None
    assert rhythm.recovery.worst is not None
    assert rhythm.recovery.worst <= 3


def test_a_ripple_chain_of_forty_stages_is_good_from_anywhere() -> None:
    rhythm = analysed(small.ripple(40), 2**40)
    assert rhythm.recovery is not None
    assert (rhythm.recovery.worst, rhythm.recovery.exact) == (0, True)


def test_a_twisted_ring_of_64_stages_is_lost() -> None:
    rhythm = analysed(small.twisted_ring(64), 128)
    assert rhythm.recovery is not None
    lost = rhythm.recovery.lost
    assert lost is not None
    assert certificate.orbit_faults(rhythm.system, lost, Effort(60)) == []
    # Stepped through, the lost state's loop is no 128 half-cycles high and 128 low.
    state, levels = lost.start, []
    for _ in range(lost.lead_half_cycles + 2 * lost.loop_half_cycles):
        levels.append(rhythm.system.out(state))
        state = rhythm.system.next(state)
    tail = levels[lost.lead_half_cycles :]
    runs = [len(run) for run in "".join(map(str, tail)).replace("01", "0 1").replace("10", "1 0").split()]
    assert set(runs[1:-1]) != {128}


def test_a_cascade_is_covered_in_stages() -> None:
    design = small.cascade(12, 2, 2999)
    rhythm = analysed(design, 3000**2)
    assert rhythm.recovery is not None
    assert rhythm.recovery.worst is not None
    names = [[v for v in stage if v.startswith("count")] for stage in map(sorted, wide.stages(rhythm.system))]
    assert names == [["count0"], ["count0", "count1"]]
    # The first counter alone may need to run to the end of its word before the second one moves.
    assert rhythm.recovery.worst >= 2 * (2**12 - 3000)


def test_components_come_before_those_that_need_them() -> None:
    needs = {"a": ["b"], "b": ["c", "a"], "c": ["c"], "d": ["a", "e"], "e": []}
    found = [sorted(part) for part in wide.components(needs)]
    assert sorted(map(tuple, found)) == [("a", "b"), ("c",), ("d",), ("e",)]
    assert found.index(["c"]) < found.index(["a", "b"]) < found.index(["d"])
    assert found.index(["e"]) < found.index(["d"])


def test_membership_in_a_repeat_is_exact() -> None:
    # Every state of a counter that steps by 6: 10, 16, …, seven of them, and no other.
    design = small.design(
        [small.flop("n", 8, small.CLOCK, e.bvadd(e.var("n", 8), e.const(6, 8)))], e.var("clk", 1)
    )
    system = analysed(design, 1).system
    formula = wide.on_beat(system, [e.var("n", 8), e.const(0, 1)], (10, 0), ((7, (6, 0)),))
    assert formula is not None
    members = [n for n in range(256) if e.evaluate([formula], {"n": n}) == [1]]
    assert members == [10, 16, 22, 28, 34, 40, 46]
