"""Glitches in the event simulator (Icarus Verilog): every bit, or every terminal of a gate, with a delay of its own,
drawn anew time after time. What is proved must never change twice, and what is refuted has to be seen to."""

from __future__ import annotations

import random
import re
import subprocess
from fractions import Fraction
from pathlib import Path

import pytest
from cases_format import CASES
from test_hazard import random_network, swings

from prover import Spec, check
from prover import expr as e
from prover.hazard import Network

TRIALS = 100


def simulated(text: str, folder: Path) -> list[int]:
    """The numbers that the simulator prints for a source with a module `bench`."""
    source, binary = folder / "bench.v", folder / "bench.vvp"
    source.write_text(text, encoding="utf-8")
    subprocess.run(["iverilog", "-g2005", "-s", "bench", "-o", binary, source], check=True, timeout=60)
    done = subprocess.run(["vvp", "-n", binary], capture_output=True, text=True, check=True, timeout=120)
    return [int(line) for line in done.stdout.split()]


# -- networks of gates -------------------------------------------------------------------------------------

NETWORK = """\
module bench;
  integer d [0:{last}];
  integer seed = {seed}, k, trial, changes = 0, most = 0;
  {inputs}
  {nets}
  {pins}
  {gates}
  always @({out}) changes = changes + 1;
  initial begin
    {then}
    {settle}
    for (trial = 0; trial < {trials}; trial = trial + 1) begin
      for (k = 0; k <= {last}; k = k + 1) d[k] = 1 + {{$random(seed)}} % 9;
      changes = 0;
      {now}
      #200;
      if (changes > most) most = changes;
      {then}
      #200;
    end
    $display("%0d", most);
    $finish;
  end
endmodule
"""


def most_in_simulation(network: Network, then: list[int], now: list[int], folder: Path) -> int:
    """The most changes of the output that some delays gave, as the inputs went from one set of values to the other."""
    pins = [(net, pin.name) for net in network.order for pin in network.gates[net].pins]
    gates, at = [], 0
    for net in network.order:
        gate = network.gates[net]
        terminals = ", ".join(f"p{at + i}" for i in range(len(gate.pins)))
        at += len(gate.pins)
        gates.append(f"{gate.kind} ({net}, {terminals});")
    text = NETWORK.format(
        last=len(pins) - 1,
        seed=1,
        trials=TRIALS,
        out=network.root.name,
        inputs=" ".join(f"reg i{k};" for k in range(len(then))),
        nets=" ".join(f"wire {net};" for net in network.order),
        pins="\n  ".join(
            f"reg p{k}; always @({name}) p{k} <= #(d[{k}]) {name};" for k, (_, name) in enumerate(pins)
        ),
        gates="\n  ".join(gates),
        then=" ".join(f"i{k} = {value};" for k, value in enumerate(then)),
        settle=" ".join(f"#20 p{k} = {name};" for k, (_, name) in enumerate(pins)) + " #20;",
        now=" ".join(f"i{k} = {value};" for k, value in enumerate(now)),
    )
    (most,) = simulated(text, folder)
    return most


@pytest.mark.parametrize("batch", range(4))
def test_gates_pulse_in_the_simulator_only_where_they_may(batch: int, tmp_path: Path) -> None:
    seen = hazards = 0
    for seed in range(12 * batch, 12 * batch + 12):
        rng = random.Random(seed)
        network = random_network(rng, 3, rng.randint(2, 5))
        then, now = ([rng.getrandbits(1) for _ in range(3)] for _ in range(2))
        leaves = [e.var(f"i{k}", 1) for k in range(3)]
        values = [{f"i{k}": value for k, value in enumerate(some)} for some in (then, now)]
        made = network.as_written(swings(values[0], values[1], leaves))
        most = most_in_simulation(network, then, now, tmp_path)
        pulses = most > (made.first is not made.last)
        assert made.hazard is e.TRUE or not pulses, (network.gates, then, now)
        hazards += made.hazard is e.TRUE
        seen += pulses
    # Delays drawn at random show most of what may happen.
    assert hazards > 0
    assert 2 * seen > hazards


# -- dividers ----------------------------------------------------------------------------------------------

DIVIDER = """\
{source}
module bench;
  reg clk = 0;
  integer seed = 1, changes = 0, most = 0, k;
  {top} dut (.clk(clk){ports});
  {copies}
  wire out = {output};
  always @(out) changes = changes + 1;
  initial begin
    {start}
    for (k = 0; k < 600; k = k + 1) begin
      changes = 0;
      {delays}
      clk = ~clk;
      #40;
      if (k > 40 && changes > most) most = changes;
    end
    $display("%0d", most);
    $finish;
  end
endmodule
"""

# Case, output, ratio, high time in half-cycles, and the registers that the output is made of, with their widths.
DIVIDERS = [
    ("faulty/pump_by_10_compare", "pump", "10", 8, {"count": 4}),
    ("faulty/pulses_same_edge", "pulses", "2", 1, {"enable": 1}),
    ("faulty/carrier_by_1_5_selected", "carrier", "1.5", 2, {"after_rise": 1, "after_fall": 1}),
    ("gauge/valve_by_3_onehot", "valve", "3", 2, {"ring": 6}),
    ("gauge/stage_by_8_gray_decoded", "one", "8", 2, {"gray": 3}),
    ("gauge/stage_by_8_gray_decoded", "two", "8", 4, {"gray": 3}),
    ("gauge/heater_by_4_gated", "pulses", "2", 1, {"open": 1}),
    ("gauge/carrier_by_4_5", "carrier", "4.5", 4, {"early": 1, "late": 1}),
    ("gauge/carrier_by_2_5", "carrier", "2.5", 2, {"count": 3, "late": 1}),
    ("gauge/carrier_by_1_5", "carrier", "1.5", 1, {"count": 2, "copy": 2}),
    ("published/two_five_two", "phase1", "9", 4, {"unit": 4}),
    ("published/two_five_two", "phase2", "9", 10, {"unit": 4}),
]


def expression_of(text: str, output: str) -> str:
    """What the source assigns to the output, or the AND that a gate drives it with."""
    found = re.search(rf"assign {output} = (.*);", text)
    if found:
        return found[1]
    found = re.search(rf"and \w+ \({output}, (.*)\);", text)
    assert found, output
    return " & ".join(found[1].split(", "))


@pytest.mark.parametrize(
    ("case", "output", "ratio", "high", "registers"), DIVIDERS, ids=[f"{d[0]}: {d[1]}" for d in DIVIDERS]
)
def test_a_divider_pulses_in_the_simulator_where_it_is_refuted(
    case: str, output: str, ratio: str, high: int, registers: dict[str, int], tmp_path: Path
) -> None:
    path = CASES / f"{case}.v"
    text = path.read_text(encoding="utf-8")
    report = check([path], Spec(ratio=Fraction(ratio), high=high, output=output))
    (finding,) = [f for f in report.findings if f.name == "glitch-free"]
    reset, clock = report.ports.reset, report.ports.clock
    copies, delays, start = [], [], []
    for name, width in registers.items():
        copies.append(f"reg [{width - 1}:0] {name}; integer d_{name} [0:{width - 1}];")
        for i in range(width):
            bit = f"[{i}]" if width > 1 else ""
            copies.append(f"always @(dut.{name}{bit}) {name}[{i}] <= #(d_{name}[{i}]) dut.{name}{bit};")
            # The clock itself arrives at once, and what it launches later.
            delays.append(f"d_{name}[{i}] = 1 + {{$random(seed)}} % 9;")
            start.append(f"d_{name}[{i}] = 1;")
    for register in report.ports.design.registers:
        code = 1 if register.name == "ring" else 0
        start.append(f"force dut.{register.name} = {code};")
    start.append("#20;")
    start += [f"release dut.{register.name};" for register in report.ports.design.registers]
    start += ["".join(f"{name} = dut.{name}; " for name in registers), "#20;"]
    bench = DIVIDER.format(
        source=text,
        top=report.ports.design.top,
        ports=f", .{reset.port}(1'b{1 - reset.active})" if reset else "",
        copies="\n  ".join(copies),
        output=expression_of(text, output),
        start="\n    ".join(start),
        delays=" ".join(delays),
    )
    (most,) = simulated(bench.replace(".clk(clk)", f".{clock}(clk)"), tmp_path)
    assert most > 0
    assert finding.verdict == ("refuted" if most > 1 else "proved")
