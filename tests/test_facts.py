"""Facts that every report carries, against lists and formulas from outside.

Source edges are numbered 1, 2, 3, … from the first rise of the input clock, as generated-clock constraints number
them. Where a value is published it is said to be read there; the others follow from the rule {1, 1 + h, 1 + 2N} with
h the high time in half-cycles.
"""

from __future__ import annotations

import re
from fractions import Fraction
from pathlib import Path

import pytest
from cases_format import CASES
from small import ripple, self_clearing
from texts import BY_3, checked, measured

from prover import Spec, check
from prover import expr as e
from prover.depth import depths
from prover.design import Design, Edge, Force, Register, Signal
from prover.effort import Effort
from prover.errors import Where
from prover.facts import number
from prover.findings import Fact
from prover.settling import settle
from prover.system import Inputs


def facts_of(case: str, ratio: str, **options: object) -> dict[str, Fact]:
    return check([CASES / case], Spec(ratio=Fraction(ratio), **options)).facts  # type: ignore[arg-type]


# The list, then where it is from.
EDGES = [
    ("gauge/chopper_by_2_cell.v", "2", {}, [1, 3, 5], "published: ÷2 {1 3 5}"),
    ("published/third_posted_as_75.v", "3", {"high": 4}, [1, 5, 7], "published: ÷3 of 66.7 % {1 5 7}"),
    ("gauge/tick_by_3_rtl.v", "3", {"high": 2, "output": "third"}, [1, 3, 7], "÷3 of 33 %, by the rule"),
    ("gauge/tick_by_3_rtl.v", "3", {"output": "tick"}, [1, 4, 7], "÷3 of 50 %, by the rule"),
    ("faulty/by_5_rising_resample.v", "5", {"high": 4}, [1, 5, 11], "÷5 of 40 %, by the rule"),
    ("published/duty_corrected.v", "5", {"parameters": {"N": 5}}, [1, 6, 11], "÷5 of 50 %, by the rule"),
    ("gauge/second_26_ge.v", "50000000", {}, [1, 50_000_001, 100_000_001], "÷50 000 000, by the rule"),
    (
        "gauge/carrier_by_1_5.v",
        "1.5",
        {"high": 2, "output": "carrier_n"},
        [1, 3, 4],
        "÷1.5 of 67 %, by the rule",
    ),
]


@pytest.mark.parametrize(
    ("case", "ratio", "options", "edges", "source"), EDGES, ids=[row[4] for row in EDGES]
)
def test_source_edges(
    case: str, ratio: str, options: dict[str, object], edges: list[int], source: str
) -> None:
    facts = facts_of(case, ratio, **options)
    assert facts["source_edges"] == edges, source
    # An even last edge: the next period begins on the other edge, and is as long only where d is a half.
    assert facts.get("source_edges_alternate", False) == (edges[-1] % 2 == 0)


def test_edge_lists_that_alternate_are_flagged_for_people(tmp_path: Path) -> None:
    from prover.report.look import Look
    from prover.report.terminal import render

    report = check(
        [CASES / "gauge/carrier_by_1_5.v"], Spec(ratio=Fraction("1.5"), high=2, output="carrier_n")
    )
    text = " ".join(render(report, Look()).split())
    assert "source edges 1, 3, 4 (edge 1 rises); every other period begins on the other edge" in text
    assert "constant only at d = 0.5" in text
    assert "constant only" not in render(checked(tmp_path, BY_3, "3"), Look())


# Rise on the rising edge and fall on the falling one: duty ((N − 1)/2 + d)/N, and so for d = 0.4 and 0.6:
DUTIES = [
    ("gauge/tick_by_3_rtl.v", "3", {"output": "tick"}, Fraction(7, 15), Fraction(8, 15)),
    ("published/duty_corrected.v", "5", {"parameters": {"N": 5}}, Fraction(12, 25), Fraction(13, 25)),
    ("gauge/ping_by_7_rtl.v", "7", {"output": "ping"}, Fraction(17, 35), Fraction(18, 35)),
]


@pytest.mark.parametrize(("case", "ratio", "options", "at_4", "at_6"), DUTIES)
def test_duty_hangs_on_the_source_s(
    case: str, ratio: str, options: dict[str, object], at_4: Fraction, at_6: Fraction
) -> None:
    spread = (Fraction(40), Fraction(60))
    facts = facts_of(case, ratio, source_duty=spread, **options)
    assert duty_at(str(facts["duty"]), Fraction(4, 10)) == at_4
    assert duty_at(str(facts["duty"]), Fraction(6, 10)) == at_6
    ends = [float(text) for text in re.findall(r"[\d.]+(?= %)", str(facts["duty_range"]))]
    assert ends == pytest.approx([100 * float(at_4), 100 * float(at_6)], rel=1e-3)
    assert facts["duty_at_half"] == "0.5"


def duty_at(formula: str, d: Fraction) -> Fraction:
    """The value of (a·d + b·(1−d))/N at d."""
    match = re.fullmatch(r"\((\d+)·d \+ (\d+)·\(1−d\)\)/(\d+)", formula)
    assert match
    a, b, n = (int(part) for part in match.groups())
    return (a * d + b * (1 - d)) / n


def test_shortest_pulses_are_those_of_the_wave_or_of_the_start(tmp_path: Path) -> None:
    facts = checked(tmp_path, BY_3, "3").facts
    assert (facts["shortest_high_half_cycles"], facts["shortest_low_half_cycles"]) == (3, 3)
    # By hand: the release cuts the first pulse to 4.5 half-cycles, of which 4 are whole; later ones are 6.
    facts = facts_of("faulty/gated_by_reset.v", "6")
    assert (facts["shortest_high_half_cycles"], facts["shortest_low_half_cycles"]) == (4, 6)
    # A quotient of 16/3 by carries: high for 2 half-cycles, and low for 8 or 10.
    facts = facts_of("published/accumulator_3_of_16.v", "16/3", mean=True)
    assert (facts["shortest_high_half_cycles"], facts["shortest_low_half_cycles"]) == (2, 8)


def test_numbers_are_written_out_however_large() -> None:
    written = {
        Fraction(5, 2): "2.5",
        Fraction(39_859_864_331_073, 2): "19929932165536.5",
        Fraction(1, 3): "1/3",
    }
    written |= {Fraction(7): "7", Fraction(1, 8): "0.125", Fraction(-3, 10): "-0.3", Fraction(9, 4): "2.25"}
    assert {value: number(value) for value in written} == written


def test_the_depth_of_registers_in_the_clock_chain() -> None:
    assert found(ripple(4)) == {"q[0]": 0, "q[1]": 1, "q[2]": 2, "q[3]": 3}
    # Three stages that ripple, and a flip-flop that the input clock clocks beside them.
    assert found(self_clearing(3)) == {"q0": 0, "q1": 1, "q2": 2, "late": 0}


def test_a_gate_adds_nothing_and_a_multiplexer_takes_the_deeper_clock() -> None:
    here, clk, en, q, sel = Where("d.v", 1), *(e.var(name, 1) for name in ("clk", "en", "q", "sel"))

    def flop(name: str, net: e.Expr) -> Register:
        return Register(name, 1, "flip-flop", (Edge(net, e.bvnot(e.var(name, 1))),), (), None, here)

    opened = Force(e.bvnot(clk), en, here)
    registers = (
        flop("en", e.bvnot(clk)),
        flop("q", e.bvand(clk, en)),
        flop("or_gated", e.bvor(clk, e.bvnot(en))),
        flop("muxed", e.ite(sel, clk, q)),
        flop("behind", e.bvand(e.var("muxed", 1), en)),
        flop("itself", e.bvnot(e.var("itself", 1))),
        Register("open", 1, "latch", (), (opened,), None, here),
    )
    signals = {"out": Signal("out", q, 0, 0, False, here)}
    design = Design("d", {"clk": 1, "sel": 1}, ("out",), registers, signals, {}, ("d.v",), "0")
    assert found(design, {"sel": 0}) == {"en": 0, "q": 0, "or_gated": 0, "muxed": 1, "behind": 2, "open": 0}
    assert found(design, {"sel": 1}) == {"en": 0, "q": 0, "or_gated": 0, "muxed": 0, "behind": 1, "open": 0}


def found(design: Design, inputs: dict[str, int] | None = None) -> dict[str, int]:
    system, _ = settle(
        design, "clk", Inputs.of(inputs or {}), design.signals["out"].value, Effort(60), races=False
    )
    return depths(system)


def test_depth_is_told_where_registers_clock_others(tmp_path: Path) -> None:
    from prover.report.look import Look
    from prover.report.terminal import render

    text = render(check([CASES / "gauge/ping_by_7_ripple.v"], Spec(ratio=Fraction(7), output="ping")), Look())
    assert "registers between clk and their clock: 0 stage0.q, delay.q; 1 stage1.q; 2 stage2.q\n" in text
    assert "between clk and their clock" not in render(measured(tmp_path, BY_3), Look())
