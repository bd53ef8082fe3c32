"""Wide dividers whose ratio moves: proved for every value. Needs no simulator; it stands here because it takes long."""

from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import pytest
from cases_format import CASES
from long_runs import LONG
from test_moves import asked

from prover import Spec, check, moves
from prover.effort import Effort

GAUGE = CASES / "gauge"

HEAD = "module {} #(parameter W = 8) (input clk, rst, input [W-1:0] div, output {} out);\n"

# Loaded at the end of a whole period, the half of it decoded: into a flip-flop, or not.
PERIOD = """
  reg [W:0] count;
  reg [W-1:0] limit;
  always @(posedge clk)
    if (rst) begin count <= 0; limit <= div; end
    else if (count == {limit, 1'b1}) begin count <= 0; limit <= div; end
    else count <= count + 1'b1;
"""

TEXTS = {
    # By hand: the divisor is read as a period begins. One that comes within a low pulse shows in the high one that
    # follows, one that comes within a high pulse only after the low one.
    "decoded": (HEAD.format("decoded", "") + PERIOD + "  assign out = count <= limit;\nendmodule\n", 2, 1),
    "registered": (
        HEAD.format("registered", "reg")
        + PERIOD
        + "  always @(posedge clk) out <= !rst && count <= limit;\nendmodule\n",
        3,
        1,
    ),
    # Through two flip-flops, each of which may be a pulse late where pulses have one input cycle.
    "synchronised": (
        HEAD.format("synchronised", "reg")
        + """
  reg [W-1:0] first, second, count;
  always @(posedge clk) begin
    {second, first} <= {first, div};
    if (rst) {out, count} <= 0;
    else if (count == 0) {out, count} <= {~out, second};
    else count <= count - 1'b1;
  end
endmodule
""",
        3,
        1,
    ),
    "prescaled": (
        HEAD.format("prescaled", "reg")
        + """
  reg [3:0] pre;
  reg [W-1:0] count, limit;
  always @(posedge clk)
    if (rst) begin pre <= 0; count <= 0; limit <= div; out <= 0; end
    else if (pre != 9) pre <= pre + 1'b1;
    else begin
      pre <= 0;
      count <= count == limit ? 0 : count + 1'b1;
      if (count == limit) begin limit <= div; out <= ~out; end
    end
endmodule
""",
        1,
        10,
    ),
}


WIDE = ["decoded", "synchronised"]


@pytest.mark.parametrize("width", [8, 24] if LONG else [8])
@pytest.mark.parametrize(
    "path", [GAUGE / "sample_wrap.v", GAUGE / "sample_at_least.v", GAUGE / "sample_by_div.v"]
)
def test_a_safe_divider_is_proved_for_every_value(path: Path, width: int) -> None:
    # By hand: the pulse at hand runs out, and the next one is right. The longest has 2·2^W half-cycles.
    ports, question = asked(path, "--set", f"W={width}", "--moving", "div", "--ratio", "2*(div+1)")
    found = moves.answer(ports, question, Effort(300))
    assert (found.proved, found.back) == (True, 2 << width), found.open


@pytest.mark.parametrize(
    ("name", "width"), [*((name, 8) for name in TEXTS), *((name, 24) for name in WIDE if LONG)]
)
def test_other_ways_to_take_a_divisor_over_are_proved(name: str, width: int, tmp_path: Path) -> None:
    text, pulses, scale = TEXTS[name]
    path = tmp_path / f"{name}.v"
    path.write_text(text)
    ratio = f"{2 * scale}*(div+1)"
    ports, question = asked(path, "--set", f"W={width}", "--moving", "div", "--ratio", ratio)
    # A compare of words may pulse within a half-cycle, which is told with nothing moving.
    question = replace(question, steady=name != "decoded")
    found = moves.answer(ports, question, Effort(300))
    # As many of the longest pulses as the comment says may be as they were.
    assert (found.proved, found.back) == (True, pulses * scale * (2 << width)), found.open


STOPS = {
    # By hand: what is stopped where its output is low has at most one high pulse left, of as many half-cycles as the
    # ratio has input cycles; a count that stands still leaves the output as it is, which its loops show, without a time.
    "low": ("if (run | out)", (0,), 24_000_000),
    "at once": ("if (run)", (0, 1), None),
}

STOPPED = """
module stopped (input clk, rst, run, output reg out);
  reg [23:0] count;
  always @(posedge clk)
    if (rst) {out, count} <= 0;
    else GUARD
      if (count == 24'd11_999_999) {out, count} <= {~out, 24'd0};
      else count <= count + 1'b1;
endmodule
"""


@pytest.mark.parametrize("name", STOPS)
def test_where_a_wide_divider_parks(name: str, tmp_path: Path) -> None:
    guard, parked, within = STOPS[name]
    path = tmp_path / "stopped.v"
    path.write_text(STOPPED.replace("GUARD", guard))
    found = check([path], Spec(ratio=Fraction(24_000_000), moving={"run": None})).findings[-1]
    assert (found.name, found.verdict) == ("enable", "proved"), found.says
    assert (found.facts["parked"], found.facts["park_half_cycles"]) == (list(parked), within)
