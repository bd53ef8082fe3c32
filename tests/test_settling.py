"""Micro-steps: the proved bound, what never settles, and outcomes that hang on the order of events."""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path

import pytest
import small

from prover import check
from prover import expr as e
from prover.design import Design, Force, Register
from prover.effort import Effort
from prover.findings import Obligation
from prover.settling import Settling, settle
from prover.spec import Spec
from prover.system import Inputs, System


def settled(design: Design, edge_wins: bool = False) -> tuple[System, Settling]:
    output = design.signals["out"].value
    inputs = Inputs.of({name: 0 for name in design.inputs if name != "clk"})
    return settle(design, "clk", inputs, output, Effort(60), edge_wins)


def test_a_synchronous_divider_settles_in_one_micro_step_by_form() -> None:
    _, found = settled(small.odd(4, 9))
    assert (found.depth, found.by_form, found.races) == (1, True, ())


@pytest.mark.parametrize("stages", [2, 3, 6, 24])
def test_a_ripple_chain_settles_in_as_many_micro_steps_as_stages(stages: int) -> None:
    bits = [e.var(f"q{i}", 1) for i in range(stages)]
    nets = [small.CLOCK, *(e.bvnot(b) for b in bits)]
    chain = [small.flop(f"q{i}", 1, nets[i], e.bvnot(bits[i])) for i in range(stages)]
    _, found = settled(small.design(chain, bits[-1]))
    assert found.depth == stages
    assert found.races == ()


@pytest.mark.parametrize("stages", [2, 3])
def test_a_self_clearing_ripple_counter_counts_and_names_the_race(stages: int) -> None:
    system, found = settled(small.self_clearing(stages))
    assert found.depth is not None
    # The stages clocked by a stage that clearing makes fall: all but the first.
    assert sorted(r.register for r in found.races) == [f"q{i}" for i in range(1, stages)]
    assert {r.kind for r in found.races} == {"release"}
    # It counts 0, 1, … 2^n − 2 and clears: common practice for this circuit.
    state = (0,) * (stages + 2)
    counted = []
    for _ in range(2 * (2**stages - 1)):
        counted.append(sum(bit << i for i, bit in enumerate(state[:stages])))
        state = system.next(state)
    assert counted[::2] == list(range(2**stages - 1))
    assert state[:stages] == (0,) * stages


def test_where_the_edge_wins_the_self_clearing_counter_goes_wrong() -> None:
    # Clearing 11 makes stage 0 fall, which clocks stage 1: if that edge wins, stage 1 is left at 1.
    system, _ = settled(small.self_clearing(2), edge_wins=True)
    state = (0, 1, 0, 0)
    assert system.next(state)[:2] == (0, 1)


def loop(name: str, value: e.Expr) -> Register:
    return Register(name, 1, "loop", (), (Force(e.TRUE, value, small.HERE),), None, small.HERE)


def test_an_inverter_that_drives_itself_never_settles() -> None:
    a = e.var("a", 1)
    q = e.var("q", 1)
    design = small.design([small.flop("q", 1, small.CLOCK, e.bvnot(q)), loop("a", e.bvnot(a))], e.bvand(q, a))
    _, found = settled(design)
    assert found.depth is None
    assert found.unsettled is not None
    assert found.unsettled.power_up
    assert len(found.unsettled.cycle) == 2


def test_cross_coupled_gates_settle() -> None:
    # One net of the pair is the loop register: q = nand(clk, nand(clk_n, q)), a latch that holds while clk is 1.
    q = e.var("q", 1)
    hold = e.bvnot(e.bvand(small.FALLING, q))
    out = e.var("t", 1)
    registers = [
        loop("q", e.bvnot(e.bvand(small.CLOCK, hold))),
        small.flop("t", 1, small.CLOCK, e.bvnot(out)),
    ]
    _, found = settled(small.design(registers, out))
    assert found.unsettled is None
    assert found.depth is not None


def test_a_decode_of_a_synchronous_counter_that_clears_it_may_pulse() -> None:
    # 3 to 4 changes three bits at once; 6 = 110 may appear on the way and clear the counter.
    count = e.var("count", 3)
    clear = e.eq(count, e.const(6, 3))
    design = small.design(
        [small.flop("count", 3, small.CLOCK, e.bvadd(count, e.const(1, 3)), clear)], e.extract(count, 2, 2)
    )
    _, found = settled(design)
    assert [race.kind for race in found.races] == ["pulse"]


def test_a_decode_of_a_synchronous_counter_used_as_a_clock_may_pulse() -> None:
    count, q = e.var("count", 3), e.var("q", 1)
    decode = e.eq(count, e.const(5, 3))
    design = small.design(
        [
            small.flop("count", 3, small.CLOCK, e.bvadd(count, e.const(1, 3))),
            small.flop("q", 1, decode, e.bvnot(q)),
        ],
        q,
    )
    _, found = settled(design)
    assert [(race.kind, race.register) for race in found.races] == [("pulse", "q")]


def test_data_launched_by_the_edge_that_makes_the_derived_clock_is_an_obligation() -> None:
    half, flag, q = e.var("half", 1), e.var("flag", 1), e.var("q", 1)
    design = small.design(
        [
            small.flop("half", 1, small.CLOCK, e.bvnot(half)),
            small.flop("flag", 1, small.CLOCK, e.bvnot(flag)),
            small.flop("q", 1, half, flag),
        ],
        q,
    )
    system, found = settled(design)
    assert [(race.kind, race.register) for race in found.races] == [("hold", "q")]
    # half rises and flag rises by the same edge; q sees flag after the launch.
    assert system.next((0, 0, 0, 0)) == (1, 1, 1, 1)


# -- clears that end themselves ------------------------------------------------------------------------------

CASES = Path(__file__).parents[1] / "cases" / "gauge"


def obligations(case: str, ratio: int, output: str) -> tuple[Obligation, ...]:
    report = check([CASES / f"{case}.v"], Spec(ratio=Fraction(ratio), output=output))
    (finding,) = [f for f in report.findings if f.name == "settling"]
    assert finding.verdict == "proved"
    return finding.obligations


@pytest.mark.parametrize(
    ("case", "ratio", "output", "decoded", "cleared"),
    [
        # What the NAND of each reads, as its comment says: the counts of 3, 5 and 7.
        ("tick_by_3_ripple", 3, "tick", (0, 1), 2),
        ("baud_by_5_ripple", 5, "baud", (0, 2), 3),
        ("ping_by_7_ripple", 7, "ping", (0, 1, 2), 3),
    ],
)
def test_a_self_clearing_counter_owes_that_its_clear_lasts(
    case: str, ratio: int, output: str, decoded: tuple[int, ...], cleared: int
) -> None:
    found = obligations(case, ratio, output)
    # Clearing makes every stage but the first see a clock edge.
    assert [each.register for each in found] == [f"stage{i}.q" for i in range(1, cleared)]
    stages = [f"stage{i}.q" for i in range(cleared)]
    lines = (CASES / f"{case}.v").read_text(encoding="utf-8").splitlines()
    for each in found:
        assert (
            f"{', '.join(f'stage{i}.q' for i in decoded[:-1])} and stage{decoded[-1]}.q make through"
            in each.text
        )
        assert f"until the slowest of {', '.join(stages[:-1])} and {stages[-1]} has cleared" in each.text
        places = dict(each.via)
        assert [name for name in places if name.startswith("stage")] == stages
        (decode,) = [where for name, where in places.items() if name == "clear_n"]
        assert lines[decode.line - 1].strip().startswith("nand")
        assert "q <= 1'b0" in lines[places["stage1.q"].line - 1]


@pytest.mark.parametrize(
    ("case", "ratio", "output"),
    [("tick_by_3_rtl", 3, "tick"), ("baud_by_5_rtl", 5, "baud"), ("ping_by_7_rtl", 7, "ping")],
)
def test_a_synchronous_counter_owes_nothing(case: str, ratio: int, output: str) -> None:
    assert obligations(case, ratio, output) == ()


def test_a_clear_that_ends_itself_is_told_where_it_makes_no_clock_edge() -> None:
    # 00, 10, then 11 for a moment: b clears both, and itself with them, on the one clock that they have.
    a, b = e.var("a", 1), e.var("b", 1)
    design = small.design(
        [small.flop("a", 1, small.CLOCK, e.TRUE, b), small.flop("b", 1, small.CLOCK, a, b)], a
    )
    system, found = settled(design)
    assert [(race.kind, race.register) for race in found.races] == [("clear", "a")]
    assert found.races[0].text == (
        "the clear that b makes through the clear ends by its own effect, and has to last until the slowest of a and b "
        "has cleared"
    )
    # From 10 the next rising edge clears both.
    assert system.next((1, 0, 0)) == (0, 0, 1)
