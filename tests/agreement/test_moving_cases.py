"""Cases with inputs that move: against plain enumeration, and their shortest runs in the event simulator."""

from __future__ import annotations

import re
import shlex
from pathlib import Path
from typing import Any

import pytest
from agreement.moving_brute import Circuit, Nominal, enumerate_runs, longest_way_back, resting
from agreement.simulator import HALF_CYCLE_UNITS, call
from agreement.test_cases_agreement import spec_of
from cases_format import Case, Group, cases

from prover.api import check, read
from prover.findings import Finding
from prover.trace import Trace

MOVING = [(case, group) for case in cases() for group in case.groups if group.moves]


def named(pairs: list[tuple[Case, Group]]) -> list[Any]:
    return [pytest.param(c, g, id=f"{c.name}: {shlex.join(g.options)}") for c, g in pairs]


def finding_of(case: Case, *options: str) -> Finding:
    group = Group(list(options))
    return next(
        f for f in check([case.path], spec_of(group)).findings if f.name in ("ratio-change", "enable")
    )


@pytest.mark.parametrize(("case", "group"), named([(c, g) for c, g in MOVING if "--set" not in g.options]))
def test_enumeration_finds_the_same(case: Case, group: Group) -> None:
    """With two bits of divisor, where there is one: enumeration goes through every set of values so far."""
    options = [*group.options, *(["--set", "W=2"] if "div" in group.options else [])]
    found = finding_of(case, *options)
    spec = spec_of(Group(options))
    design = read([case.path], spec)
    (name,) = spec.moving
    circuit = Circuit(design, name, design.outputs[0])
    nominal: Nominal = {}
    for value in circuit.values:
        ratio = spec.ratio_formula.value({name: value}) if spec.ratio_formula else spec.ratio
        nominal = {**nominal, value: (int(ratio or 0), int(ratio or 0))}
    brute = enumerate_runs(circuit, nominal, long_too=found.name == "ratio-change")
    if brute.broken is not None:
        assert found.trace is not None
        assert (found.trace.half_cycles, found.trace.rests[-1].moved) == brute.broken
        return
    assert found.verdict == "proved"
    runs = [value for value in circuit.values if found.name == "ratio-change" or value == 1]
    back = [longest_way_back(circuit, brute.reached[v], v, *nominal[v]) for v in runs]
    assert found.facts["back_half_cycles"] == max(time for time in back if time is not None)
    if found.name == "enable":
        rests = resting(circuit, brute.reached[0], 0)
        assert rests is not None
        assert (found.facts["parked"], found.facts["park_half_cycles"]) == (sorted(rests[0]), rests[1])


REFUTED = [
    (case, group) for case, group in MOVING if any("refuted" in m.verdicts for m in group.moves.values())
]


@pytest.mark.parametrize(("case", "group"), named(REFUTED))
def test_the_simulator_shows_the_run_that_refutes(case: Case, group: Group, tmp_path: Path) -> None:
    """Reset is held and released, and the inputs are driven as in the trace: the output is the same at each rest."""
    found = finding_of(case, *group.options)
    assert found.trace is not None
    spec = spec_of(group)
    design = read([case.path], spec)
    told, pulses = simulated(
        case, design.top, design.outputs[0], dict(spec.parameters), found.trace, tmp_path
    )
    assert told == [level for rest in found.trace.rests for level in rest.outputs.values()]
    if found.trace.on_the_way:
        # Between two events of one moment: of what the output does the simulator shows a pulse without a length.
        assert (pulses[-1:] == [(1, 0)]) == ("the output pulses to 1" in found.says)
        return
    # The pulse that the finding tells of, as long as the simulator saw it.
    length = re.match(r"a (low|high) pulse of (\d+) half-cycles?,", found.says)
    if length:
        level, units = pulses[-1]
        assert (("low", "high")[level], units) == (length[1], int(length[2]) * HALF_CYCLE_UNITS)
    elif "of part of a half-cycle" in found.says:
        assert 0 < pulses[-1][1] < HALF_CYCLE_UNITS
    else:
        # It goes on: for as long as was told.
        lasts = re.search(r"it lasts (\d+) half-cycles", found.says)
        assert lasts
        if int(lasts[1]) < 10_000:
            _, later = simulated(
                case,
                design.top,
                design.outputs[0],
                dict(spec.parameters),
                found.trace,
                tmp_path,
                int(lasts[1]),
            )
            assert int(lasts[1]) * HALF_CYCLE_UNITS in [units for _, units in later]


def simulated(
    case: Case, top: str, output: str, parameters: dict[str, int], trace: Trace, folder: Path, more: int = 0
) -> tuple[list[int], list[tuple[int, int]]]:
    """The output at each rest of the trace, and every pulse that it made from the release of reset on: its level and
    its length in units of time. It runs on for `more` half-cycles."""
    first = trace.rests[0]
    moving = [name for name in first.inputs if name != "rst"]
    # Two input cycles of reset, so that the clock is where the trace begins.
    lines = [
        "`timescale 1ns/1ps",
        "module bench;",
        f"  reg clk = {first.registers['clk']}, rst = 1;",
        *(f"  reg [63:0] {name} = {first.inputs[name]};" for name in moving),
        f"  {top} #({', '.join(f'.{n}({v})' for n, v in parameters.items())}) dut (.clk(clk), .rst(rst), "
        f".{output}(), {', '.join(f'.{name}({name})' for name in moving)});",
        "  time last; reg started = 0;",
        f'  always @(dut.{output}) if (started) begin $display("pulse %0d %0d", !dut.{output}, $time - last); '
        "last = $time; end",
        "  initial begin",
        f"    repeat (8) #{HALF_CYCLE_UNITS} clk = ~clk;",
        f"    #{HALF_CYCLE_UNITS // 2 - 20} rst = 0; #10 started = 1; last = $time;",
        f'    #0 $display("rest %0d", dut.{output});',
    ]
    at = 0
    for rest in trace.rests[1:]:
        if rest.half_cycle > at:
            at = rest.half_cycle
            # An edge comes at each full multiple of the half-cycle.
            lines.append(f"    #({HALF_CYCLE_UNITS} - $time % {HALF_CYCLE_UNITS}) clk = ~clk; #10;")
        if rest.moved:
            moves = " ".join(f"{name} = {rest.inputs[name]};" for name in moving)
            lines.append(f"    #({HALF_CYCLE_UNITS // 2} - $time % {HALF_CYCLE_UNITS}) {moves} #10;")
        lines.append(f'    $display("rest %0d", dut.{output});')
    lines += [
        f"    repeat ({more}) #({HALF_CYCLE_UNITS} - $time % {HALF_CYCLE_UNITS}) clk = ~clk;",
        "    #1 $finish;",
    ]
    (folder / "bench.v").write_text("\n".join([*lines, "  end", "endmodule", ""]))
    call(["iverilog", "-g2005", "-s", "bench", "-o", "bench.vvp", "bench.v", str(case.path)], folder, 60)
    printed = call(["vvp", "-n", "bench.vvp"], folder, 60).splitlines()
    pulses = [tuple(map(int, line.split()[1:])) for line in printed if line.startswith("pulse")]
    return [int(line.split()[1]) for line in printed if line.startswith("rest")], [(a, b) for a, b in pulses]
