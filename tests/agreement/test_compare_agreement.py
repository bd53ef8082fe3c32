"""Random pairs of small dividers: verdict, first differing half-cycle and lag are those of plain enumeration.

Some pairs are equal by construction, with the states of one coded anew; some differ in one entry of a table. A handful
runs in the event simulator (Icarus Verilog), with the inputs moving as in the run that is shown.
"""

from __future__ import annotations

import random
import subprocess
from collections import Counter
from itertools import pairwise
from pathlib import Path

import pytest
from agreement import pairs
from agreement.pairs import Plan

from prover import Pairing, Spec
from prover.compared import Outcome
from prover.comparison import judge
from prover.effort import Effort
from prover.expr import variables
from prover.pair import match
from prover.trace import Trace

NEAR = 160
"""Half-cycles up to which a lag is looked for: more than two of these dividers' loops."""


def random_pair(rng: random.Random, inputs: int) -> tuple[Plan, Plan]:
    old = pairs.random_plan(rng, inputs)
    kind = rng.random()
    if kind < 0.5:
        return old, pairs.recoded(rng, old)
    if kind < 0.8:
        return old, pairs.mutated(rng, pairs.recoded(rng, old))
    return old, pairs.random_plan(rng, inputs)


def judged(old: Plan, new: Plan, moving: bool, lag: int | None, settled: bool = False) -> Outcome:
    # A reset that acts at an edge is told from the enable by its name alone, so both are named.
    spec = Spec(clock="clk", reset="rst=1")
    moves = ("u",) if moving and used(old, new) else ()
    pairing = Pairing(old=spec, new=spec, moving=moves, lag=lag, settled=settled)
    return judge(match(pairs.design(old, "old"), pairs.design(new, "new"), pairing), pairing, Effort(60))


def used(*plans: Plan) -> bool:
    """Whether some output depends on the inputs, as the reader sees it."""
    designs = [pairs.design(plan, "x") for plan in plans]
    return any(v.name == "u" for d in designs for v in variables(d.all_expressions()))


@pytest.mark.parametrize("moving", [False, True])
def test_random_pairs_agree_with_enumeration(moving: bool) -> None:
    rng = random.Random(20 + moving)
    seen: Counter[str] = Counter()
    for number in range(190):
        old, new = random_pair(rng, rng.choice([0, 1, 1, 2]) if not moving else rng.choice([1, 1, 2]))
        lag = rng.choice([0, 0, 0, 0, 0, 1, -1, 2])
        found = judged(old, new, moving, lag)
        first = pairs.first_difference(old, new, moving, lag)
        wanted = "proved" if first is None else "refuted"
        assert found.verdict == wanted, (number, found.says, first)
        if found.difference is not None:
            assert found.difference.half_cycle == first, number
        seen[wanted] += 1
    assert min(seen.values()) > 40, seen


def test_lags_agree_with_enumeration() -> None:
    rng = random.Random(30)
    seen: Counter[str] = Counter()
    for number in range(120):
        old, new = random_pair(rng, rng.choice([0, 0, 1]))
        found = judged(old, new, False, None)
        wanted = pairs.least_lag(old, new, NEAR)
        assert found.verdict == ("refuted" if wanted is None else "proved"), (number, found.says, wanted)
        assert found.lag == wanted, number
        seen[found.verdict] += 1
    assert min(seen.values()) > 20, seen


def test_loops_agree_with_enumeration() -> None:
    rng = random.Random(40)
    seen: Counter[str] = Counter()
    for number in range(60):
        old, new = random_pair(rng, rng.choice([0, 0, 1]))
        found = judged(old, new, False, None, settled=True)
        wanted = pairs.same_once_settled(old, new)
        assert found.verdict == ("refuted" if wanted is None else "proved"), (number, found.says)
        settled = found.facts.get("settled_half_cycles")
        if wanted is not None and settled is not None:
            # What it takes to show the wave may be less than what it takes to be on the loop.
            assert isinstance(settled, int)
            assert settled <= wanted
        seen[found.verdict] += 1
    assert min(seen.values()) > 5, seen


# -- in the event simulator --------------------------------------------------------------------------------

BENCH = """\
`timescale 1ns/1ps
module bench;
  reg clk = CLK, rst = 0;
  reg [WIDTH:0] u = 0;
  wire old, new;
  old one (.clk(clk), .rst(rst)PORT, .out(old));
  new two (.clk(clk), .rst(rst)PORT, .out(new));
  task show; $write(" %b%b", old, new); endtask
  initial begin
    #1 rst = 1;
    repeat (40) begin #1 clk = ~clk; end
    #1 ONE.a = A; ONE.b = B; TWO.a = C; TWO.b = D; u = U;
    #1 rst = 0;
    #1 show;
RUN
    $display;
    $finish;
  end
endmodule
"""


def bench(old: Plan, new: Plan, trace: Trace) -> str:
    """Both in one bench, brought to the state in which the trace begins, and moved as it moves."""
    first = trace.rests[0]
    lines = []
    for before, rest in pairwise(trace.rests):
        if rest.moved:
            lines.append(f"    #1 u = {rest.inputs.get('u', 0)}; #1 show;")
        else:
            assert rest.half_cycle == before.half_cycle + 1
            lines.append("    #1 clk = ~clk; #1 show;")
    values = {
        "CLK": first.registers["clk"],
        "WIDTH": max(old.inputs, 1) - 1,
        "PORT": ", .u(u)" if old.inputs else "",
        "ONE.": "one.",
        "TWO.": "two.",
        "= A;": f"= {first.registers['old.a']};",
        "= B;": f"= {first.registers['old.b']};",
        "= C;": f"= {first.registers['new.a']};",
        "= D;": f"= {first.registers['new.b']};",
        "= U;": f"= {first.inputs.get('u', 0)};",
        "RUN": "\n".join(lines),
    }
    text = BENCH
    for name, value in values.items():
        text = text.replace(name, str(value))
    return "\n".join([text, pairs.verilog(old, "old"), pairs.verilog(new, "new")])


def simulated(text: str, folder: Path) -> list[tuple[int, int]]:
    (folder / "bench.v").write_text(text, encoding="utf-8")
    for command in (
        ["iverilog", "-g2005", "-s", "bench", "-o", "bench.vvp", "bench.v"],
        ["vvp", "-n", "bench.vvp"],
    ):
        done = subprocess.run(command, cwd=folder, capture_output=True, text=True, timeout=60, check=False)
        assert done.returncode == 0, done.stdout + done.stderr
    return [(int(pair[0]), int(pair[1])) for pair in done.stdout.split()]


def test_runs_that_differ_do_so_in_the_simulator(tmp_path: Path) -> None:
    rng = random.Random(50)
    shown = 0
    while shown < 8:
        old, new = random_pair(rng, rng.choice([1, 2]))
        found = judged(old, new, True, 0)
        if found.difference is None or not isinstance(found.difference.shown, Trace):
            continue
        trace = found.difference.shown
        if trace.half_cycles < 3 and rng.random() < 0.7:
            continue
        # What begins as a state of both goes on as the trace says, and ends with outputs that differ.
        seen = simulated(bench(old, new, trace), tmp_path)
        assert seen == [tuple(rest.outputs.values()) for rest in trace.rests]
        assert seen[-1][0] != seen[-1][1]
        shown += 1
