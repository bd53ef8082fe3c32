"""Test benches in the event simulator (Icarus Verilog): each fails on the divider that it was written for, telling the
figures of the report, and passes on the same divider mended.

Self-clearing loops have one unit of delay at the gates that the case names, as in the other comparisons.
"""

from __future__ import annotations

import re
import shlex
import subprocess
from collections.abc import Sequence
from dataclasses import replace
from fractions import Fraction
from itertools import pairwise
from pathlib import Path
from typing import Any, NamedTuple

import pytest
from agreement.simulator import delay_gates
from agreement.test_cases_agreement import spec_of
from cases_format import CASES, Case, Group, cases, read_case
from long_runs import LONG
from vcdvcd import VCDVCD

from prover.api import check
from prover.findings import Finding
from prover.report import testbench
from prover.report.checks import MOST_HALF_CYCLES
from prover.report.testbench import Bench
from prover.spec import Spec

SECONDS = 60

# What mends each faulty case: texts to replace, the same for all its groups but where one is named.
MENDED: dict[str, list[tuple[str, str]]] = {
    "by_3_rising_resample": [("posedge clk) late", "negedge clk) late")],
    "by_5_rising_resample": [
        ("posedge clk or posedge rst)\n    if (rst) late", "negedge clk or posedge rst)\n    if (rst) late")
    ],
    "by_7_clears_at_6": [("q2, q1);", "q2, q1, q0);")],
    "by_7_rising_resample": [("posedge clk) late", "negedge clk) late")],
    "cell_loses_remainder": [("next[4] ? 4'd0 : next[3:0]", "next[3:0]")],
    "clears_on_the_way": [("(clear, ~q0, ~q1, q2)", "(clear, 1'b0, ~q1, q2)")],
    "clears_and_sets_itself": [
        ("assign clear = run & pulse_bit;", "assign clear = 1'b0;"),
        ("assign set = run & ~pulse_bit;", "assign set = 1'b0;"),
    ],
    "compare_out_of_reach": [("reg [3:0] count", "reg [4:0] count")],
    "decode_upside_down": [("and decode", "nand decode")],
    "enable_held_off": [("else if (enable)", "else")],
    "falling_off_reset": [("falling <= falling[1] ? 2'd0 : falling + 2'd1;", "falling <= rising;")],
    "gate_opened_by_its_clock": [("gated = clk & enable;", "gated = clk;")],
    "gated_by_reset": [("rst_n & (count < 3'd3)", "count >= 3'd3")],
    "gate_that_chases_itself": [("~chase;", "1'b1;")],
    "half_ratio_one_edge": [
        (
            "assign carrier = count == 3'd0 || count == 3'd2;",
            "reg late; always @(negedge clk) late <= count == 3'd2;\n"
            "  assign carrier = count == 3'd0 || late;",
        )
    ],
    "inverter_loop": [("assign spin = ~spin;", "assign spin = 1'b0;")],
    "keeper_of_gates": [("keep = seen & enable", "keep = half & enable")],
    "latch_behind_a_decode": [("always @* if (open) held =", "always @(posedge clk) if (open) held <=")],
    "late_for_its_limit": [("count == 6'd9", "count >= 6'd9")],
    "lockup_pair": [("case (count)", "case (count > 4'd11 ? 4'd11 : count)")],
    "off_by_one": [("count == 10", "count >= 9")],
    "onehot_ring_4": [("ring[3]};", "~|ring[2:0]};")],
    "onehot_ring_4_initial": [("ring[3]};", "~|ring[2:0]};")],
    "onehot_ring_5_reset": [("ring[4]};", "~|ring[3:0]};")],
    "oversteps_compare": [("count == 12'd1000", "count >= 12'd999")],
    "prescaler_off_reset": [
        (
            "always @(posedge clk) phase <= last",
            "always @(posedge clk or negedge rst_n) if (!rst_n) phase <= 2'd0; else phase <= last",
        )
    ],
    "pump_gated_bare": [
        ("assign pump = half & run;", "reg held; always @* if (!half) held = run; assign pump = half & held;")
    ],
    "pump_gated_same_edge": [
        ("held <= run;", ""),
        ("{half, held, count} <= 4'd0", "{half, count} <= 3'd0"),
        ("  assign pump", "  always @* if (!half) held = run;\n  assign pump"),
    ],
    "radio_swallow_short": [
        ("reg [2:0] pre", "reg [3:0] pre"),
        ("pre == (more", "pre == (rounds == 4'd0 ? 4'd3 + swallow : more"),
    ],
    "release_level": [("falling <= falling[1] ? 2'd0 : falling + 2'd1;", "falling <= rising;")],
    "reset_filtered": [("rst & (&seen)", "rst & seen[0]")],
    "restless_in_reset": [("if (rst) bad <= spin;", "bad <= 1'b0;")],
    "sample_chopped": [
        ("reg [W:0] count;", "reg [W:0] count; reg [W-1:0] limit;"),
        ("count <= 0;\n", "count <= 0;\n      limit <= div;\n"),
        (
            "count <= count >= {div, 1'b1} ? 0 : count + 1'b1;",
            "count <= count >= {limit, 1'b1} ? 0 : count + 1'b1;\n      if (count >= {limit, 1'b1}) limit <= div;",
        ),
        ("sample <= count <= div;", "sample <= count <= limit;"),
    ],
    "sample_overtaken": [("count == div", "count >= div")],
    "sample_no_zero": [("left == 4'd1", "left <= 4'd1")],
    "saturates_at_15": [("count == 4'd9", "count >= 4'd9")],
    "signed_never_there": [("reg signed [3:0]", "reg signed [4:0]")],
    "toggle_at_ratio": [("RATIO - 1", "RATIO / 2 - 1")],
    "truncated_limit": [("parameter [7:0]", "parameter [9:0]"), ("reg [7:0]", "reg [9:0]")],
    "truncated_reload": [("reg [3:0]", "reg [4:0]")],
    "twisted_ring_4": [("ring <= {", "ring <= !(ring[0] | ring[3]) ? 4'b0001 : {")],
    "twisted_ring_5": [("ring <= {", "ring <= !(ring[0] | ring[4]) ? 5'b00001 : {")],
    "twisted_ring_5_reset": [("q <= {", "q <= !(q[1] | q[5]) ? 5'b10000 : {")],
    "two_pulses": [
        (
            "count == 4'd1 || count == 4'd4 || count == 4'd5",
            "count >= 4'd1 && count <= 4'd3",
        )
    ],
    "wrong_edge_toggle": [
        (
            "if (count == 3'd3) other_side <= ~other_side;\n  end",
            "end\n  always @(negedge clk) if (count == 3'd3) other_side <= ~other_side;",
        )
    ],
    "presettable_5_plain": [("q <= {", "q <= !(q[1] | q[TAP]) ? 5'd1 : {")],
    "ring_by_4_5": [("{ff[9],", "{~|ff[1:8],")],
    "shift_xnor": [("^(stage & TAPS)};", "^(stage & TAPS)} & ~{STAGES{&stage}};")],
    "shift_xor": [("^(stage & TAPS)};", "^(stage & TAPS) | stage == 0};")],
    "twisted_repair_010": [("q[3] <= q[2] & (q[1] | q[3]);", "if (!(q[1] | q[N])) q <= 1;")],
    "twisted_repair_both": [
        ("q[3] <= (q[1] & q[2]) | (q[2] & q[3]) | (q[1] & q[3]);", "if (!(q[1] | q[N])) q <= 1;")
    ],
    "ring_64_onehot": [("ring[63]};", "~|ring[62:0]};")],
    "ring_64_twisted": [("ring <= {", "ring <= !(ring[0] | ring[63]) ? 64'd1 : {")],
    "noise_24_xnor": [("q[17])};", "q[17])} & ~{24{&q}};")],
    "noise_32_lfsr": [("^ q[1] ^ q[0]};", "^ q[1] ^ q[0] ^ (q == 32'd0)};")],
    "sample_one_value": [("div == 24'd70000 ? 24'd70001 : div", "div")],
    "pump_gated_25m": [("if (SAFE) begin", "if (1) begin")],
    "valve_by_90_ring": [("ring[89]};", "~|ring[88:0]};")],
    # What these are claimed to be, in their registers and ports.
    "presettable_5": [
        (
            "q <= {q[4:1], data};\n    q[3] <= q[2] & (q[1] | q[3]);",
            "q <= q[5:2] >= 4'd8 ? 5'd1 : {q[5:2] + 4'd1, q[5:2] < 4'd4};",
        )
    ],
    "third_posted_as_75": [("{~count[0], ~count[0] & count[1]}", "count + 2'd1"), ("= count[1]", "= |count")],
    "accumulator_3_of_16: --ratio 5 --high 2": [
        ("{carry, sum} <= sum + 5'd3", "{carry, sum} <= sum >= 4'd4 ? 5'd16 : {1'b0, sum + 4'd1}")
    ],
    "accumulator_3_of_16: --ratio 11/2 --mean --high 2": [
        ("{carry, sum} <= sum + 5'd3", "{carry, sum} <= sum >= 4'd10 ? 5'd16 : {sum == 4'd4, sum + 4'd1}")
    ],
}

# The same for glitches alone, where a flip-flop behind the output is no cure, or not one that is easily written.
BRIDGED = {
    "stage_by_8_unbridged": [
        (
            "or merge (two, at_6, at_7);",
            "wire bridge; and over (bridge, gray[2], gray[1]);\n  or merge (two, at_6, at_7, bridge);",
        )
    ],
    "carrier_by_1_5_selected": [
        ("after_rise <= count != 2'd1;", "if (count != 2'd2) after_rise <= ~after_rise;"),
        ("after_fall <= count != 2'd0;", "if (count != 2'd1) after_fall <= ~after_fall;"),
        ("clk ? after_rise : after_fall", "after_rise ^ after_fall"),
    ],
    "pulses_same_edge": [("always @(posedge clk) enable", "always @(negedge clk) enable")],
    "rain_by_6_function": [("always @* show(count);", "always @(posedge clk) rain <= count < 3'd3;")],
    "preset_modulus": [
        ("assign carry = &count;", "reg made; always @(posedge clk) made <= &count; assign carry = made;"),
        ("else if (carry)", "else if (&count)"),
    ],
    "two_five_two": [
        ("assign phase1 = unit < 4'd2", "reg one, two; assign phase1 = one, phase2 = two"),
        (
            "assign phase2 = unit >= 4'd2 && unit < 4'd7;",
            "always @(posedge osc) begin one <= unit < 4'd2; two <= unit >= 4'd2 && unit < 4'd7; end",
        ),
    ],
    "sonde_by_8_decoded": [
        (
            "and decode (window, q_n[2], q_n[1]);",
            "reg made; always @(posedge clk) made <= q_n[2] & q_n[1]; assign window = made;",
        )
    ],
}

# Claims that no divider with these registers and this clocking keeps.
UNMENDED = {("accumulator_3_of_16", "--ratio", "5.5", "--high", "2")}

# Why a refuted property has no bench.
WITHOUT = {
    "recovery": "it would have to run for",
    "reset": "of a mean ratio no one pulse is known to be too short",
    "enable": "lies within a half-cycle",
}


class Ran(NamedTuple):
    """What a simulation ended with and printed."""

    status: int
    printed: str


def simulate(
    folder: Path, bench: Bench, divider: str, options: Sequence[str] = (), language: str = "2001"
) -> Ran:
    """The bench with that text of the divider, compiled without a warning about the bench, and run."""
    (folder / "bench.v").write_text(bench.text)
    (folder / "divider.v").write_text(divider)
    command = ["iverilog", f"-g{language}", "-Wall", "-o", "bench.vvp", *options]
    made = subprocess.run(
        [*command, "bench.v", "divider.v"],
        cwd=folder,
        capture_output=True,
        text=True,
        timeout=SECONDS,
        check=False,
    )
    assert made.returncode == 0, made.stderr
    harmless = ("inherited timescale", "only be evaluated once")
    told = [
        line
        for line in made.stderr.splitlines()
        if "bench.v" in line and not any(words in line for words in harmless)
    ]
    assert not told, told
    done = subprocess.run(
        ["vvp", "-n", "bench.vvp"], cwd=folder, capture_output=True, text=True, timeout=SECONDS, check=False
    )
    return Ran(done.returncode, done.stdout)


def refuted(case: Case) -> list[Group]:
    out = []
    for group in case.groups:
        verdicts = [each.verdicts for each in group.properties.values()]
        verdicts += [each.verdicts for each in group.moves.values()]
        out += [group] if any("refuted" in each for each in verdicts) else []
    return out


EVERY = [
    pytest.param(case, group, id=f"{case.name}: {shlex.join(group.options)}")
    for case in [*cases(), *(read_case(path) for path in sorted((CASES / "wide").glob("*.v")))]
    for group in refuted(case)
]
ALL = EVERY if LONG else EVERY[::2]


def numbers(text: str) -> list[str]:
    return re.findall(r"\d+", text)


def came(printed: str) -> str:
    (line,) = [
        line.removeprefix("came:").strip() for line in printed.splitlines() if line.startswith("came:")
    ]
    return line


def agrees(finding: Finding, told: str) -> bool:
    """Whether what came in the simulator is what the finding says, as far as both give figures."""
    if finding.glitch is not None:
        levels = [finding.glitch.level, *(arrival.level for arrival in finding.glitch.arrivals)]
        changes = sum(a != b for a, b in pairwise(levels))
        return told.startswith(f"{changes} changes of the output where {finding.glitch.arrivals[0].name}, ")
    if finding.trace is not None and finding.name in ("ratio-change", "enable"):
        short = re.search(r"of (\d+) half-cycles?, shorter than (\d+)", finding.says)
        wanted = numbers(told)[1:3] if "whole" in told else numbers(told)[1:2]
        if short:
            return wanted == [short[1], short[2]]
        if "of part of a half-cycle" in finding.says:
            return wanted[0] == "0"
        goes_on = re.search(r"goes on after (\d+) half-cycles", finding.says)
        return goes_on is not None and wanted == [goes_on[1]]
    if finding.name == "reset" or "arrive in this order" in told:
        return figures_agree(finding.says, told)
    if told.startswith(("a rise-to-rise gap of", "a high run of")) and "more than" not in told:
        return f"of {numbers(told)[0]} half-cycles, not" in finding.says
    if finding.name == "no-stuck" or told.startswith("no "):
        level = re.search(r"stays (\d)", finding.says)
        return level is not None and (told.startswith("no ") or f"stays {level[1]} " in told)
    if finding.name == "recovery" and told.startswith("a run at"):
        # A run that is told apart by its length is one of those that the report lists of the loop.
        value, length = numbers(told)[:2]
        if "more than" in told:
            return True
        word = "high" if value == "1" else "low"
        period = re.search(r"period (\d+) half-cycles, high (\d+)", finding.says)
        if period:
            runs = {"high": int(period[2]), "low": int(period[1]) - int(period[2])}
            return runs[word] == int(length)
        return f"{word} {length}" in finding.says
    if "gaps in" in told:
        # Both are on the same side of the mean that is claimed.
        reported = re.search(
            r"(\d+|a) rise-to-rise gaps? takes? (\d+) half-cycles, not ([\d/]+)", finding.says
        )
        seen = re.fullmatch(r"(\d+) gaps in (\d+) half-cycles, not ([\d/]+) each, .*", told)
        assert seen
        if reported is None:
            # What is said of a loop that never becomes good is its wave.
            return finding.name == "recovery"
        off = Fraction(reported[2]) - Fraction(reported[3])
        return off * (Fraction(int(seen[2]), int(seen[1])) - Fraction(seen[3])) > 0
    return True


def figures_agree(says: str, told: str) -> bool:
    """What is said of a release in half-cycles may be told in halves of them; other texts have the same names."""
    told_run = re.match(r"a run at (\d) of (\d+) (halves of a half-cycle|half-cycles), not (\d+)", told)
    said_run = re.search(r"a (high pulse|low gap) of ([\d.]+) half-cycles, not ([\d.]+)", says)
    if told_run:
        units = 2 if told_run[3].startswith("halves") else 1
        length, wanted = int(told_run[2]) / units, int(told_run[4]) / units
        if said_run is None:
            return "the output hangs on it" in says or "after the release" in says
        if (said_run[1] == "high pulse") == (told_run[1] == "1"):
            return (length, wanted) == (float(said_run[2]), float(said_run[3]))
        # A pulse that is too long for its period leaves a gap that is too short.
        return float(said_run[2]) + length == float(said_run[3]) + wanted
    stuck = re.match(r"a run at (\d) of more than", told)
    if stuck:
        return said_run is not None or f"stays {stuck[1]}" in says
    if told.startswith("another output once more"):
        return "the output hangs on it" in says or "too short" in says
    name = told.partition(" becomes ")[0]
    return told.count(" becomes ") == 1 and (f" of {name} " in says or "for a moment on the way" in says)


@pytest.mark.parametrize(("case", "group"), ALL)
def test_a_bench_fails_as_told_and_passes_on_the_divider_mended(
    case: Case, group: Group, tmp_path: Path
) -> None:
    spec = spec_of(group)
    report = check([case.path], spec)
    made, notes = testbench.benches(report)
    text = case.path.read_text(encoding="utf-8")
    findings = {f.name: f for f in report.findings if f.verdict == "refuted"}
    assert len(made) + len(notes) == len(findings)
    for note in notes:
        name = note.removeprefix("no test bench for ").partition(":")[0]
        assert name in findings
        assert WITHOUT[name] in note
    options = [f"-I{case.path.parent}", *(f"-D{name}={value}" for name, value in spec.defines.items())]
    for bench in made:
        ran = simulate(tmp_path, bench, delay_gates(text, case.delayed), options)
        assert ran.status == 1, ran.printed
        assert ran.printed.startswith("claimed: "), ran.printed
        assert ran.printed.endswith("\nFAILED\n"), ran.printed
        assert "not as reported" not in ran.printed, ran.printed
        assert agrees(findings[bench.name], came(ran.printed)), (findings[bench.name].says, ran.printed)
    glitches = [bench for bench in made if bench.name == "glitch-free"]
    others = [bench for bench in made if bench not in glitches]
    # A claim for each value of an input is looked at again where it fails.
    at = next((f.facts["at"] for f in findings.values() if "at" in f.facts), {})
    if isinstance(at, dict) and at:
        spec = replace(spec, each={name: ((value, value),) for name, value in at.items()})
    stem = case.path.stem
    mended = MENDED.get(f"{stem}: {shlex.join(group.options)}", MENDED.get(stem))
    assert mended or not others or (stem, *group.options) in UNMENDED
    if mended:
        passes(case, spec, others, replaced(text, mended), options, tmp_path)
    if case.path.parent.name != "wide":
        bridges = BRIDGED.get(stem)
        cured = replaced(text, bridges) if bridges else registered(text)
        passes(case, spec, glitches, cured, options, tmp_path)


def replaced(text: str, repairs: list[tuple[str, str]]) -> str:
    for old, new in repairs:
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    return text


def registered(text: str) -> str:
    """The divider with a flip-flop behind its last assignment, which is that of the output: no decode of it pulses."""
    before, assign, rest = text.rpartition("  assign ")
    name, _, value = rest.partition(";")[0].partition(" = ")
    made = f"  reg made;\n  always @(posedge clk) made <= {value};\n  assign {name} = made;\nendmodule\n"
    return before + made if assign else text


def passes(case: Case, spec: Spec, benches: list[Bench], text: str, options: list[str], folder: Path) -> None:
    """The benches pass on the text, of which the prover proves their properties; wide ones take it too long."""
    if not benches:
        return
    if case.path.parent.name != "wide":
        path = folder / "mended.v"
        path.write_text(text)
        verdicts = {f.name: f.verdict for f in check([path], spec).findings}
        # Of inputs that move within a range no invariant may be found in time.
        allowed = {"proved", "open"} if spec.moving else {"proved"}
        assert {verdicts[bench.name] for bench in benches} <= allowed, verdicts
    for bench in benches:
        ran = simulate(folder, bench, delay_gates(text, case.delayed), options)
        assert (ran.status, ran.printed.endswith("\nPASSED\n")) == (0, True), ran.printed


# -- what names and registers may be -----------------------------------------------------------------------

# Each by 4 as written, so that by 2 or by 8 is refuted from a start state that has to be set in another way.
SHAPES = {
    "names that need escaping": """\
module \\top"]]>-- (input \\clk//x , input \\t , output \\out[0] );
  reg [1:0] \\stage0.q , \\n[1] ;
  always @(posedge \\clk//x ) begin \\stage0.q <= \\stage0.q + \\t ; \\n[1] [1] <= \\stage0.q [1]; end
  always @(negedge \\clk//x ) \\n[1] [0] <= \\n[1] [1];
  assign \\out[0] = \\stage0.q [1];
endmodule
""",
    "instances and blocks of escaped names": """\
module top (input clk, output out);
  \\a.b \\u.v (clk, out);
endmodule
module \\a.b (input clk, output out);
  genvar i;
  generate for (i = 0; i < 2; i = i + 1) begin : \\g[x]
    wire ck;
    reg q;
    always @(posedge ck) q <= ~q;
  end endgenerate
  assign \\g[x] [0].ck = clk, \\g[x] [1].ck = ~\\g[x] [0].q;
  assign out = \\g[x] [1].q;
endmodule
""",
    "inputs named as the bench's own": """\
module top (input clk, input last, input [3:0] rose, input dut, input t, output out);
  reg [1:0] failed;
  always @(posedge clk) if (last & ~dut & t) failed <= failed + (rose == 4'd9);
  assign out = failed[1];
endmodule
""",
    "a reversed vector, partly a wire": """\
module top (input clk, output out);
  reg [0:2] n;
  always @(posedge clk) n[0] <= ~n[0];
  always @(posedge clk) n[1] <= n[1] ^ n[0];
  always @* n[2] = n[1];
  assign out = n[2];
endmodule
""",
    "words of a memory": """\
module top (input clk, output out);
  reg [1:0] m [0:1];
  reg at;
  always @(posedge clk) begin at <= ~at; m[at] <= m[~at] + {1'b0, at}; end
  assign out = m[0][1] ^ m[1][1] ^ m[0][0] ^ 1'b0;
endmodule
""",
    "latches": """\
module top (input clk, output out);
  reg [1:0] first, second;
  always @* if (!clk) first = second + 2'd1;
  always @* if (clk) second = first;
  assign out = second[1];
endmodule
""",
    "an array of instances": """\
module stage (input ck, output reg q); always @(negedge ck) q <= ~q; endmodule
module top (input clk, output out);
  wire [1:0] q;
  stage pair [1:0] (.ck({q[0], clk}), .q(q));
  assign out = q[1];
endmodule
""",
    "a parameter below zero and one beyond 32 bits": """\
module top #(parameter signed LOW = 0, parameter [39:0] WIDE = 0) (input clk, output out);
  reg [1:0] n;
  always @(posedge clk) n <= LOW == -3 && WIDE == 40'h9876543210 ? n + 2'd1 : 2'd0;
  assign out = n[1];
endmodule
""",
    "values that blocks compute on the way": """\
module top (input clk, output reg out);
  reg [1:0] n = 2'd0, next;
  always @* next = n + 2'd1;
  always @(posedge clk) begin : step
    reg odd;
    odd = ^next;
    n <= next;
    out <= n[1] & (odd | ~odd);
  end
endmodule
""",
    "blocks without names": """\
module top (input clk, output out);
  genvar i;
  if (1) begin wire w = clk; end
  for (i = 0; i < 2; i = i + 1) begin
    reg q;
    if (i == 0) always @(posedge clk) q <= ~q;
    else begin : after reg again; always @(posedge clk) begin again <= ~again ^ again; q <= q ^ genblk2[0].q; end end
  end
  assign out = genblk2[1].q;
endmodule
""",
    "an inout as input": """\
module top (input clk, inout on, output out);
  reg [1:0] n;
  always @(posedge clk) if (on) n <= n + 2'd1;
  assign out = n[1];
endmodule
""",
}
CHOSEN: dict[str, dict[str, Any]] = {
    "names that need escaping": {"clock": "\\clk//x", "holds": {"t": 1}},
    "inputs named as the bench's own": {"holds": {"last": 1, "rose": 9, "dut": 0, "t": 1}},
    "a parameter below zero and one beyond 32 bits": {"parameters": {"LOW": -3, "WIDE": 0x9876543210}},
    "an inout as input": {"holds": {"on": 1}},
}


@pytest.mark.parametrize("start", ["any", None])
@pytest.mark.parametrize("name", SHAPES)
def test_any_register_can_be_set_under_any_name(name: str, start: Any, tmp_path: Path) -> None:
    path = tmp_path / "source.v"
    path.write_text(SHAPES[name])
    report = check([path], Spec(ratio=Fraction(8), start=start, **CHOSEN.get(name, {})))
    made, notes = testbench.benches(report)
    # Orders of arrival need registers that can be held.
    assert all(note.endswith("words of memories can't be held") for note in notes)
    assert bool(notes) <= ("memory" in name)
    assert len(made) + len(notes) == sum(f.verdict == "refuted" for f in report.findings)
    assert "ratio" in [bench.name for bench in made]
    for bench in made:
        ran = simulate(tmp_path, bench, SHAPES[name])
        assert ran.status == 1, ran.printed
        assert ran.printed.endswith("\nFAILED\n"), ran.printed
        assert "not as reported" not in ran.printed, ran.printed


def test_systemverilog_is_set_as_well(tmp_path: Path) -> None:
    text = """\
module top (input logic clk, output logic out);
  typedef enum logic [1:0] {A, B, C, D} place;
  place at;
  logic next;
  always_comb next = at == B;
  always_ff @(posedge clk) case (at) A: at <= B; B: at <= C; C: at <= D; D: at <= A; endcase
  always_latch if (clk) out = (at == C || at == D) & (next | ~next);
endmodule
"""
    path = tmp_path / "source.sv"
    path.write_text(text)
    made, notes = testbench.benches(check([path], Spec(ratio=Fraction(8))))
    assert not notes
    for bench in made:
        ran = simulate(tmp_path, bench, text, language="2012")
        assert (ran.status, ran.printed.endswith("\nFAILED\n")) == (1, True), ran.printed


def test_what_a_string_can_not_hold_is_printed_as_an_escape(tmp_path: Path) -> None:
    name = '\\50%"x\\n%d%s'
    text = f"module top (input clk, output {name} );\nreg q; always @(posedge clk) q <= ~q; assign {name} = q;\nendmodule\n"
    path = tmp_path / "source.v"
    path.write_text(text)
    report = check([path], Spec(ratio=Fraction(4), start="any"))
    finding = report.findings[0]
    hostile = replace(finding, claim='50 %d "%s" \\n \x1b[2J \n é end', says="")
    (bench,), _ = testbench.benches(replace(report, findings=(hostile,)))
    ran = simulate(tmp_path, bench, text)
    assert ran.printed.splitlines()[0] == 'claimed: 50 %d "%s" \\n \\x1b[2J \\n \\xe9 end'


def test_the_status_is_what_the_user_defines(tmp_path: Path) -> None:
    text = "module top (input clk, output reg q); always @(posedge clk) q <= ~q; endmodule\n"
    path = tmp_path / "source.v"
    path.write_text(text)
    made, _ = testbench.benches(check([path], Spec(ratio=Fraction(4))))
    ran = simulate(tmp_path, made[0], text, ["-DTESTBENCH_FAIL=$finish_and_return(42)"])
    assert (ran.status, ran.printed.endswith("\nFAILED\n")) == (42, True)


def test_all_waves_are_dumped_where_the_user_names_a_file(tmp_path: Path) -> None:
    text = "module top (input clk, output reg q); always @(posedge clk) q <= ~q; endmodule\n"
    path = tmp_path / "source.v"
    path.write_text(text)
    made, _ = testbench.benches(check([path], Spec(ratio=Fraction(4))))
    simulate(tmp_path, made[0], text)
    assert not (tmp_path / "wave.vcd").exists()
    simulate(tmp_path, made[0], text, ['-DTESTBENCH_DUMP="wave.vcd"'])
    dump = VCDVCD(str(tmp_path / "wave.vcd"))
    (name,) = (signal for signal in dump.signals if signal.endswith(".dut.q"))
    # By 2, as it is written: 200 units from rise to fall.
    rises = [time for time, value in dump[name].tv if value == "1"][-3:]
    assert {later - sooner for sooner, later in pairwise(rises)} == {400}


def test_a_long_run_is_bounded(tmp_path: Path) -> None:
    # By 2^21 instead of 2^22: the wrong gap ends after some three million half-cycles.
    text = "module top (input clk, output out); reg [20:0] n; always @(posedge clk) n <= n + 1; assign out = n[20]; endmodule\n"
    path = tmp_path / "source.v"
    path.write_text(text)
    report = check([path], Spec(ratio=Fraction(1 << 22), start="any"))
    made, notes = testbench.benches(report)
    assert len(made) + len(notes) == sum(f.verdict == "refuted" for f in report.findings)
    assert all(f"benches end at {MOST_HALF_CYCLES}" in note for note in notes)
    assert all(len(bench.text) < 10_000 for bench in made)
    for bench in made:
        assert simulate(tmp_path, bench, text).status == 1
