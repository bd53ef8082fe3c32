"""Accumulators shown by single steps: held against the state graph, which enumerates every state and every wave."""

from __future__ import annotations

import json
import random
from dataclasses import replace
from fractions import Fraction
from math import gcd
from pathlib import Path

import pytest

from prover import Spec, analyse, check, circle, graph
from prover.accumulator import Accumulator
from prover.api import read
from prover.certificate import discharge
from prover.collect import collect
from prover.effort import Effort
from prover.evidence import as_object
from prover.evidence import read as read_evidence
from prover.ports import recognise
from prover.rebuild import Rejected, rebuild
from prover.rhythm import Mean

# Added to at one edge of the clock, round a circle of M values; the output is a decode, or a flip-flop or two behind it.
TEXT = """\
module adder #(parameter W = 8, M = 256, C = 3, T = 0, A = 128) (input clk, input rst, output out);
  reg [W:0] sum;
  wire [W:0] next = sum + C;
  always @({edge} clk)
    if (rst) sum <= 0;
    else sum <= next >= M ? next - M : next;
  wire [W:0] from = sum >= T ? sum - T : sum + M - T;
  wire on = from < A;
  {behind}
endmodule
"""

BEHIND = [
    "assign out = on;",
    "reg q; always @(posedge clk) q <= on; assign out = q;",
    "reg q; always @(negedge clk) q <= on; assign out = q;",
    "reg p, q; always @(posedge clk) {p, q} <= {on, p}; assign out = q;",
]


@pytest.mark.parametrize("seed", range(40))
def test_what_single_steps_show_is_what_the_graph_shows(seed: int, tmp_path: Path) -> None:
    rng = random.Random(seed)
    modulus = 256 if seed % 4 == 0 else rng.randrange(130, 256)
    stride = rng.randrange(2, modulus // 3)
    start, arc = rng.randrange(modulus), rng.randrange(1, modulus)
    text = TEXT.replace("{edge}", rng.choice(["posedge", "negedge"])).replace("{behind}", rng.choice(BEHIND))
    source = tmp_path / "adder.v"
    source.write_text(text)
    ratio = Fraction(modulus, stride)
    parameters = {"M": modulus, "C": stride, "T": start, "A": arc}
    spec = Spec(ratio=ratio, mean=True, parameters=parameters, waivers={"glitch-free": "decoded"})
    report = check([source], spec)
    assert report.rhythm.accumulator is None
    system, first = report.rhythm.system, report.rhythm.starts[0].state
    found = circle.look(system, first, Mean(ratio), Effort(60))
    verdicts = {finding.name: finding.verdict for finding in report.findings}
    if found is None:
        # Then the arc or the rest is too short, or cosets have several waves.
        rest = modulus - arc
        assert min(arc, rest) < stride or arc % gcd(modulus, stride)
        return
    assert verdicts["recovery"] == "proved"
    assert verdicts["no-stuck"] == "proved"
    recovery = report.rhythm.recovery
    assert recovery is not None
    assert found.worst >= (recovery.worst or 0)
    if found.slowest is not None:
        assert found.worst == recovery.worst
    for loop in report.rhythm.loops:
        for level in (0, 1):
            lengths = {size for value, size in loop.wave.runs if value == level}
            assert lengths == set(found.runs(level))


@pytest.mark.parametrize(
    ("bits", "addend"), [(32, 89478485), (32, 1234567891), (40, 3 << 30), (64, 1 << 60 | 1)]
)
def test_wide_accumulators_are_proved(bits: int, addend: int, tmp_path: Path) -> None:
    # By the general law: addend carries in 2^bits cycles, next to 2^bits/addend cycles apart.
    source = tmp_path / "adder.v"
    source.write_text(
        f"""module adder (input clk, input rst_n, output reg tick);
          reg [{bits - 1}:0] sum;
          always @(posedge clk or negedge rst_n)
            if (!rst_n) {{tick, sum}} <= 0;
            else {{tick, sum}} <= {{1'b0, sum}} + {bits + 1}'d{addend};
        endmodule"""
    )
    report = check([source], Spec(ratio=Fraction(1 << bits, addend), mean=True, high=2))
    assert {finding.name: finding.verdict for finding in report.findings} == {
        "ratio": "proved",
        "high-time": "proved",
        "no-stuck": "proved",
        "recovery": "proved",
        "settling": "proved",
        "glitch-free": "proved",
        "reset": "proved",
    }
    # A tick is a carry that may be anything at power-up, for one input cycle.
    recovery = report.rhythm.recovery
    assert recovery is not None
    assert (recovery.worst, recovery.exact) == (2, True)


@pytest.mark.parametrize("wrong", ["sum + C + (sum == 5)", "sum ^ C", "sum == 77 ? sum : sum + C"])
def test_what_does_not_go_on_by_one_stride_is_not_shown(wrong: str, tmp_path: Path) -> None:
    source = tmp_path / "adder.v"
    source.write_text(
        "module adder #(parameter C = 7) (input clk, input rst, output out);\n"
        "  reg [7:0] sum;\n"
        f"  always @(posedge clk) if (rst) sum <= 0; else sum <= {wrong};\n"
        "  assign out = sum[7];\n"
        "endmodule\n"
    )
    spec = Spec(ratio=Fraction(256, 7), mean=True)
    ports = recognise(read([source], spec), spec)
    rhythm = analyse.rhythm_of(ports, spec, Effort(60))
    assert graph.fits(rhythm.system)
    for start in rhythm.starts:
        assert circle.look(rhythm.system, start.state, Mean(Fraction(256, 7)), Effort(60)) is None


def test_what_is_said_of_an_accumulator_is_rechecked(tmp_path: Path) -> None:
    source = tmp_path / "adder.v"
    source.write_text(
        "module adder (input clk, input rst, output reg q);\n"
        "  reg [25:0] sum;\n"
        "  wire [25:0] next = sum + 26'd4321;\n"
        "  always @(posedge clk)\n"
        "    if (rst) sum <= 0; else sum <= next >= 26'd50_000_000 ? next - 26'd50_000_000 : next;\n"
        "  always @(negedge clk) q <= sum >= 26'd12_000_000;\n"
        "endmodule\n"
    )
    spec = Spec(ratio=Fraction(50_000_000, 4321), mean=True, effort=60)
    report = check([source], spec)
    evidence = collect(report, Effort(60))
    found = evidence.everywhere
    assert isinstance(found, Accumulator)
    assert read_evidence(json.loads(json.dumps(as_object(evidence)))) == evidence

    def holds(changed: Accumulator) -> bool:
        try:
            rebuilt = rebuild(report.ports, spec, replace(evidence, everywhere=changed), Effort(60))
        except Rejected:
            return False
        return all(discharge(owed, Effort(60)) for owed in rebuilt.obligations)

    assert holds(found)
    begins, size = found.arc
    assert not holds(replace(found, base=found.base + 1))
    assert not holds(replace(found, modulus=found.modulus - 1))
    assert not holds(replace(found, stride=found.stride + 1))
    assert not holds(replace(found, level=1 - found.level))
    assert not holds(replace(found, arc=(begins + 1, size)))
    assert not holds(replace(found, arc=(begins, size + 1)))
    assert not holds(replace(found, late=not found.late))
    assert not holds(replace(found, behind=0, worst=found.joined))
    assert not holds(replace(found, worst=found.worst - 1))
    assert found.slowest is not None
    assert not holds(replace(found, slowest=report.rhythm.starts[0].state))
