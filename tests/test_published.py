"""Published values: count sequences and duties of standard parts, twisted rings and what mends them, shift registers.

Each table names where its values are published; [M] marks those known from memory and recomputed by enumeration only.
"""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from cases_format import CASES

from prover import Spec, check, graph, measure
from prover import expr as e
from prover.effort import Effort
from prover.findings import Report
from prover.rhythm import Goal

PUBLISHED = CASES / "published"

# OEIS A000016: cycles of an n-stage shift register that feeds back the complement of its last stage.
RING_LOOPS = {3: 2, 4: 2, 5: 4, 6: 6, 7: 10, 8: 16, 9: 30, 10: 52, 11: 94, 12: 172}

# References: cycle lengths of the twisted ring other than 2n.
ODD_LENGTHS = {3: {2}, 4: set(), 5: {2}, 6: {4}, 7: {2}, 8: set(), 9: {2, 6}, 10: {4}, 11: {2}, 12: {8}}

# References, published correction circuits: worst recovery in input cycles, and states that never recover.
REPAIRS = {
    "twisted_repair_010": {3: (2, 0), 4: (5, 0), 5: (10, 0), 6: (12, 4), 8: (16, 64), 10: (20, 444)},
    "twisted_repair_both": {3: (1, 0), 4: (3, 0), 5: (5, 0), 6: (6, 4), 8: (8, 52), 10: (10, 368)},
    # The textbook's: home within n - 1 input cycles from every state [M].
    "twisted_load": {n: (n - 1, 0) for n in range(3, 13)},
}

RING = """\
module ring #(parameter N = 3) (input clk, output first, output flagged);
  reg [N:1] q;
  always @(posedge clk) q <= {q[N-1:1], ~q[N]};
  wire [N:1] turn = q ^ {q[N-1:1], ~q[N]};
  wire illegal = |(turn & (turn - 1'b1));
  assign first = q[1];
  assign flagged = q[1] ^ illegal;
endmodule
"""


def verdicts(report: Report) -> dict[str, str]:
    return {finding.name: finding.verdict for finding in report.findings}


def case(name: str, ratio: int | str, high: int | None = None, **options: Any) -> Report:
    """The report on a published case; `high` in half-cycles."""
    return check([PUBLISHED / f"{name}.v"], Spec(ratio=Fraction(ratio), high=high, **options))


# -- twisted rings -----------------------------------------------------------------------------------------


@pytest.mark.parametrize("stages", RING_LOOPS)
def test_a_twisted_ring_has_the_published_loops_and_illegal_states(stages: int, tmp_path: Path) -> None:
    source = tmp_path / "ring.v"
    source.write_text(RING, encoding="utf-8")
    claim = Spec(ratio=Fraction(2 * stages), output="flagged", parameters={"N": stages})
    report = check([source], claim)
    rhythm = report.rhythm
    assert rhythm.complete
    assert len(rhythm.loops) == RING_LOOPS[stages]
    assert sum(loop.good for loop in rhythm.loops) == 1
    # A loop of codes lasts two half-cycles a code.
    assert {loop.length // 2 for loop in rhythm.loops} - {2 * stages} == ODD_LENGTHS[stages]
    assert sum(loop.length for loop in rhythm.loops) == 2 << stages
    assert rhythm.recovery is not None
    # References: 2^n - 2n illegal codes; each is a state at either level of the clock.
    assert rhythm.recovery.illegal == 2 * (2**stages - 2 * stages)
    assert verdicts(report)["recovery"] == "refuted"


@pytest.mark.parametrize(
    ("circuit", "stages", "cycles", "lost"),
    [(circuit, n, *figures) for circuit, table in REPAIRS.items() for n, figures in table.items()],
)
def test_a_correction_circuit_recovers_as_published(
    circuit: str, stages: int, cycles: int, lost: int
) -> None:
    report = case(circuit, 2 * stages, output="flagged", parameters={"N": stages})
    found = report.rhythm.recovery
    assert found is not None
    if lost == 0:
        assert verdicts(report)["recovery"] == "proved"
        assert (found.worst, found.exact) == (2 * cycles, True)
    else:
        # The common claim that the gate makes every ring correct itself is false from six stages on.
        assert verdicts(report)["recovery"] == "refuted"
        assert found.lost is not None
    assert lost_states_and_worst(report, 4 * stages, 2 * stages) == (2 * lost, 2 * cycles)


def lost_states_and_worst(report: Report, period: int, high: int) -> tuple[int, int]:
    """Power-up states that never become good, and the half-cycles that the slowest of the others needs."""
    effort = Effort(60)
    states = graph.build(report.rhythm.system, effort)
    table = graph.ranks(states, graph.basins(states, effort, Goal(period, high)), Goal(period, high))
    ranks = table.rank[states.start]
    return int((ranks < 0).sum()), int(ranks.max())


def test_the_smallest_ring_that_the_gate_does_not_mend_shows_a_code_that_stays_out() -> None:
    report = case("twisted_repair_010", 12, output="flagged", parameters={"N": 6})
    lost = report.rhythm.recovery.lost if report.rhythm.recovery else None
    assert lost is not None
    codes = {
        lost.state(t)[0] for t in range(lost.lead_half_cycles, lost.lead_half_cycles + lost.loop_half_cycles)
    }
    # References: the loop of 011001, read from the first stage on, which is the lowest bit.
    assert int("011001"[::-1], 2) in codes
    assert len(codes) == 4


# References, decade and octal Johnson parts: carry high for the first half; within 11 input cycles by the data
# sheet of the decade part, while enumeration says 10 and 5.
@pytest.mark.parametrize(("part", "states", "worst_cycles"), [("johnson_10", 10, 10), ("johnson_8", 8, 5)])
def test_the_johnson_parts_keep_their_data_sheets_promise(part: str, states: int, worst_cycles: int) -> None:
    report = case(part, states, output="carry", within=2 * 11)
    assert report.verdict == "proved"
    wave = report.rhythm.orbits[0].wave()
    assert wave is not None
    assert (wave.period, wave.high) == (2 * states, states)
    recovery = report.rhythm.recovery
    assert recovery is not None
    assert recovery.worst is not None
    assert recovery.worst <= 2 * worst_cycles


# References, presettable five-stage part: feedback tap, pair (1: AND of two complements, 2: OR), ratio, half-cycles
# high, and the states of 32 that never recover.
FED_BACK = [
    *((tap, 0, 2 * tap, 2 * tap, 0) for tap in (1, 2, 3, 4, 5)),
    (1, 1, 3, 2, 0),
    (2, 1, 5, 4, 0),
    (3, 1, 7, 6, 0),
    (4, 1, 9, 8, 0),
    (1, 2, 3, 4, 0),
    (2, 2, 5, 6, 0),
    (3, 2, 7, 8, 0),
    (4, 2, 9, 10, 4),
]


@pytest.mark.parametrize(("tap", "pair", "ratio", "high", "lost"), FED_BACK)
def test_the_presettable_part_divides_as_its_feedback_says(
    tap: int, pair: int, ratio: int, high: int, lost: int
) -> None:
    report = case("presettable_5", ratio, high, parameters={"TAP": tap, "PAIR": pair})
    # Codes that differ only in stages which the output never sees are one and the same to it.
    never, _ = lost_states_and_worst(report, 2 * ratio, high)
    assert never == 2 * lost
    assert verdicts(report)["recovery"] == ("refuted" if lost else "proved")
    assert sum(loop.good for loop in report.rhythm.loops) == 1


# References, bench measurement of that part: complements of stages 1 to 5 from 11111 on, by 2 and by 4.
BENCH = {
    1: ["11111", "01111", "10111", "01111", "10111"],
    2: ["11111", "01111", "00111", "10011", "11001", "01100", "00110", "10011"],
}


@pytest.mark.parametrize("tap", BENCH)
def test_the_presettable_part_counts_as_on_the_bench(tap: int) -> None:
    report = case("presettable_5", 2 * tap, parameters={"TAP": tap})
    system = report.rhythm.system
    state = dict.fromkeys(system.names, 0)
    seen = []
    for _ in BENCH[tap]:
        (code,) = e.evaluate([report.ports.design.signals["q"].value], state)
        seen.append("".join(str(1 - (code >> stage & 1)) for stage in range(5)))
        for _ in range(2):
            state = system.describe(system.next(tuple(state[name] for name in system.names)))
    assert seen == BENCH[tap]


# -- count sequences ---------------------------------------------------------------------------------------


def counted(report: Report, bits: list[str]) -> list[int]:
    """The codes that a divider runs through, the first bit lowest, one an input cycle, from the least one on."""
    system, design = report.rhythm.system, report.ports.design
    values = [design.signals[name].value for name in bits]
    (loop,) = [loop for loop in report.rhythm.loops if loop.good]
    state = loop.example if loop.example[-1] == 0 else system.next(loop.example)
    codes = []
    for _ in range(loop.length // 2):
        read = e.evaluate(values, {**dict(report.ports.running.values), **system.describe(state)})
        codes.append(sum(value << place for place, value in enumerate(read)))
        state = system.next(system.next(state))
    least = codes.index(min(codes))
    return codes[least:] + codes[:least]


OUTPUTS = ["q0", "q1", "q2", "q3"]
COUNTING = {"mr2": 1, "ms1": 0, "ms2": 0}

# References, published function tables: case, output, ratio, half-cycles high, held inputs, the bits, the sequence.
SEQUENCES = [
    ("decade_bcd", "q3", 10, 4, COUNTING, OUTPUTS, list(range(10))),
    ("decade_biquinary", "q0", 10, 10, COUNTING, OUTPUTS, [0, 2, 4, 6, 8, 1, 3, 5, 7, 9]),
    ("fifth_section", "q3", 5, 2, {}, ["q1", "q2", "q3"], [0, 1, 2, 3, 4]),
    ("sixteenth", "q3", 16, 16, {"mr2": 1}, OUTPUTS, list(range(16))),
]


@pytest.mark.parametrize(("name", "output", "ratio", "high", "holds", "bits", "sequence"), SEQUENCES)
def test_a_part_counts_as_its_function_table(
    name: str, output: str, ratio: int, high: int, holds: dict[str, int], bits: list[str], sequence: list[int]
) -> None:
    report = case(name, ratio, high, output=output, holds=holds)
    assert report.verdict == "proved"
    assert counted(report, bits) == sequence


def test_the_sections_illegal_codes_go_where_the_table_says() -> None:
    # References: 5, 6 and 7 go to 2, 2 and 0 in one clock [M] for the cell's equations.
    report = case("fifth_section", 5, 2)
    system, design = report.rhythm.system, report.ports.design
    bits = [design.signals[name].value for name in ("q1", "q2", "q3")]
    after: dict[int, int] = {}
    for code in range(8):
        values = {"q1": code & 1, "q2": code >> 1 & 1, "q3_state": code >> 2, "cp_n": 1}
        state = system.next(tuple(values[name] for name in system.names))
        read = e.evaluate(bits, system.describe(state))
        after[code] = sum(value << place for place, value in enumerate(read))
    assert after == {0: 1, 1: 2, 2: 3, 3: 4, 4: 0, 5: 2, 6: 2, 7: 0}


# References, reset and set table of the decade part: both resets clear, both sets give 9 and win.
@pytest.mark.parametrize(
    ("mr", "ms", "code"), [((1, 1), (0, 0), 0), ((1, 1), (0, 1), 0), ((1, 1), (1, 1), 9), ((0, 0), (1, 1), 9)]
)
def test_the_decade_part_is_reset_and_set_by_its_table(
    mr: tuple[int, int], ms: tuple[int, int], code: int
) -> None:
    holds = {"mr1": mr[0], "mr2": mr[1], "ms1": ms[0], "ms2": ms[1]}
    spec = Spec(output="q3", clock="clk_n", holds=holds)
    report = measure([PUBLISHED / "decade_bcd.v"], spec)
    system, design = report.rhythm.system, report.ports.design
    bits = [design.signals[name].value for name in OUTPUTS]
    (loop,) = report.rhythm.loops
    read = e.evaluate(bits, system.describe(loop.example))
    assert sum(value << place for place, value in enumerate(read)) == code
    assert loop.stuck
    # It holds whatever the clock does: the loop is the clock's own.
    assert loop.length == 2


def test_the_gray_count_is_the_published_one() -> None:
    # OEIS A003188.
    gray = [0, 1, 3, 2, 6, 7, 5, 4, 12, 13, 15, 14, 10, 11, 9, 8]
    report = check([CASES / "gauge" / "stage_by_16_gray.v"], Spec(ratio=Fraction(16)))
    assert report.verdict == "proved"
    assert counted(report, ["gray"]) == gray


@pytest.mark.parametrize("preset", range(15))
def test_loading_on_the_last_count_divides_by_16_less_the_preset(preset: int) -> None:
    # References, four-bit counters with load [M].
    report = case("preset_modulus", 16 - preset, 2, holds={"p": preset})
    found = verdicts(report)
    # The carry is decoded from several bits that change together, but where 14 and 15 take turns.
    assert found.pop("glitch-free") == ("proved" if preset == 14 else "refuted")
    assert set(found.values()) == {"proved"}


@pytest.mark.parametrize("power", range(2, 15))
def test_the_selected_power_of_two(power: int) -> None:
    # References, programmable powers of two: by 2^k.
    report = case("power_select", 1 << power, holds={"k": power})
    assert report.verdict == "proved"


# -- shift registers ---------------------------------------------------------------------------------------

# References, tap table of maximal shift registers, from three stages on; the number of the stage of each tap.
TAPS = {3: (3, 2), 4: (4, 3), 5: (5, 3), 6: (6, 5), 7: (7, 6), 8: (8, 6, 5, 4), 9: (9, 5), 10: (10, 7)}


def mask(stages: int) -> int:
    return sum(1 << tap - 1 for tap in TAPS[stages])


@pytest.mark.parametrize("stages", TAPS)
@pytest.mark.parametrize("case_name", ["shift_xor", "shift_xnor"])
def test_a_maximal_shift_register_has_one_state_outside_its_round(stages: int, case_name: str) -> None:
    parameters = {"STAGES": stages, "TAPS": mask(stages)}
    report = case(case_name, 2**stages - 1, 2, parameters=parameters)
    assert verdicts(report)["ratio"] == "proved"
    assert sorted(loop.length // 2 for loop in report.rhythm.loops) == [1, 2**stages - 1]
    # XOR locks up at all zeros, XNOR at all ones.
    (locked,) = [loop for loop in report.rhythm.loops if loop.stuck]
    assert locked.example[0] == (0 if case_name == "shift_xor" else 2**stages - 1)


@pytest.mark.parametrize("stages", [4, 5, 8, 10])
def test_a_shift_register_with_the_missing_state_put_in_goes_through_all(stages: int) -> None:
    report = case("shift_full", 2**stages, 2, parameters={"STAGES": stages, "TAPS": mask(stages)})
    found = verdicts(report)
    assert found.pop("glitch-free") == "refuted"
    assert set(found.values()) == {"proved"}
    assert [loop.length for loop in report.rhythm.loops] == [2 * 2**stages]


# OEIS A011260: sets of taps, the last stage among them, that make an n-stage register maximal.
@pytest.mark.parametrize(("stages", "sets"), [(2, 1), (3, 2), (4, 2), (5, 6)])
def test_the_number_of_maximal_sets_of_taps(stages: int, sets: int) -> None:
    maximal = 0
    for lower in range(1 << stages - 1):
        parameters = {"STAGES": stages, "TAPS": lower | 1 << stages - 1}
        report = measure([PUBLISHED / "shift_xor.v"], Spec(parameters=parameters))
        maximal += max(loop.length for loop in report.rhythm.loops) == 2 * (2**stages - 1)
    assert maximal == sets
