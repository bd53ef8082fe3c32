"""How long reading takes: generated sources of growing length, deep expressions, and every case.

    python tests/bench/reading.py [rounds]

The generated sources have 50 lines a module: counters, ripple stages, decodes, loops, functions and instances. Prints
tables and asserts nothing: the time a line should be the same in each row, whatever it is on the machine.
"""

from __future__ import annotations

import contextlib
import statistics
import sys
import tempfile
import time
from collections.abc import Callable
from pathlib import Path

from prover import UserError, read

CASES = Path(__file__).parents[2] / "cases"
LINES = (1_000, 2_500, 5_000, 10_000)
PER_MODULE = 50
DEPTHS = (1_000, 2_500, 5_000, 10_000)

HEAD = """\
module stage{i} #(parameter LAST = {last}) (input clk, input rst, input [7:0] data, output [7:0] q);
  reg [7:0] count;
  reg late;
  always @(posedge clk or posedge rst)
    if (rst) count <= 8'd0;
    else if (count >= LAST) count <= 8'd0;
    else count <= count + 8'd1;
  always @(negedge clk) late <= count[{bit}];
  function [7:0] mix;
    input [7:0] a;
    integer k;
    begin
      mix = a;
      for (k = 0; k < 4; k = k + 1) mix = mix ^ (a << k);
    end
  endfunction
  wire [7:0] part0 = data;
"""
LINE = "  wire [7:0] part{n} = part{m} + (count ^ 8'd{c}) - {{late, data[6:0]}};\n"
FOOT = "  assign q = mix(part{n}) & {{8{{late}}}};\nendmodule\n"


def module(i: int) -> str:
    """One module of PER_MODULE lines."""
    head = HEAD.format(i=i, last=i % 250 + 1, bit=i % 8)
    many = PER_MODULE - head.count("\n") - FOOT.count("\n")
    body = "".join(LINE.format(n=n + 1, m=n, c=(i * 7 + n) % 256) for n in range(many))
    return head + body + FOOT.format(n=many)


def generated(lines: int) -> str:
    """A source of about that many lines: modules, and a top that has an instance of each."""
    count = lines // (PER_MODULE + 1)
    ports = "\n".join(f"  stage{i} u{i} (clk, rst, w{i}, w{i + 1});" for i in range(count))
    wires = ", ".join(f"w{i + 1}" for i in range(count))
    top = f"module top (input clk, input rst, output [7:0] q);\n  wire [7:0] w0 = 8'd1;\n  wire [7:0] {wires};\n"
    return "".join(module(i) for i in range(count)) + top + ports + f"\n  assign q = w{count};\nendmodule\n"


DEEP: dict[str, Callable[[int], str]] = {
    "a sum of n terms": lambda n: " + ".join(["a"] * n),
    "n brackets": lambda n: "(" * n + "a" + ")" * n,
    "n negations": lambda n: "~" * n + "a",
    "n conditions": lambda n: "a ? b : " * n + "a",
    "n shifts and parities": lambda n: "^(" * (n // 2) + "a" + " << 1)" * (n // 2),
}


def seconds(text: str, path: Path, rounds: int) -> float:
    """The median time of reading the text."""
    path.write_text(text, encoding="utf-8")
    times = []
    for _ in range(rounds):
        began = time.perf_counter()
        read([path])
        times.append(time.perf_counter() - began)
    return statistics.median(times)


def main() -> None:
    rounds = int(sys.argv[1]) if len(sys.argv) > 1 else 3
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "generated.v"
        seconds(generated(100), path, 1)
        print(f"{'lines':>8}{'modules':>9}{'median s':>10}{'µs a line':>11}")
        for lines in LINES:
            text = generated(lines)
            took, count = seconds(text, path, rounds), text.count("\n")
            print(f"{count:8}{text.count('endmodule'):9}{took:10.3f}{took / count * 1e6:11.1f}")
        print(f"\n{'deep expressions':24}" + "".join(f"{f'n = {n}':>12}" for n in DEPTHS) + "   (µs a level)")
        for name, deep in DEEP.items():
            cells = []
            for depth in DEPTHS:
                text = f"module m (input clk, input [7:0] a, b, output [7:0] q);\nassign q = {deep(depth)};\nendmodule\n"
                cells.append(seconds(text, path, rounds) / depth * 1e6)
            print(f"{name:24}" + "".join(f"{cell:12.1f}" for cell in cells))
    times = {}
    for case in sorted(CASES.rglob("*.v")):
        runs = []
        for _ in range(rounds):
            began = time.perf_counter()
            with contextlib.suppress(UserError):
                read([case])
            runs.append(time.perf_counter() - began)
        times[case] = statistics.median(runs)
    slowest = sorted(times, key=lambda case: -times[case])[:5]
    print(f"\n{len(times)} cases: median {statistics.median(times.values()) * 1e3:.1f} ms; the slowest:")
    for case in slowest:
        print(f"  {case.parent.name}/{case.name:32}{times[case] * 1e3:8.1f} ms")


if __name__ == "__main__":
    main()
