"""Small dividers as Verilog, for tests of what the user sees, and ways to ask for a report on them."""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path
from typing import Any

from prover import Spec, check, measure
from prover.findings import Report

# A third of the oscillator at 50 %: sound in every respect.
BY_3 = """\
module by_3 (input clk, input rst, output tick);
  reg [1:0] count;
  reg late;
  wire upper = count == 2'd2;
  always @(posedge clk)
    if (rst) count <= 2'd0;
    else if (count >= 2'd2) count <= 2'd0;
    else count <= count + 2'd1;
  always @(negedge clk) late <= upper;
  assign tick = upper | late;
endmodule
"""

# A fifth, high for two input cycles, in a module of its own. Count 7 holds itself, and 5 and 6 lead there.
STICKS_AT_7 = """\
module stage (input clk, input rst, output wide);
  reg [2:0] count;
  always @(posedge clk)
    if (rst) count <= 3'd0;
    else if (count == 3'd4) count <= 3'd0;
    else if (count != 3'd7) count <= count + 3'd1;
  assign wide = count < 3'd2;
endmodule
module sticks_at_7 (input clk, input rst, output tick);
  stage stage0 (.clk(clk), .rst(rst), .wide(tick));
endmodule
"""

# One inverter fed by itself.
SPINS = """\
module spins (input clk, output tick);
  reg half;
  wire spin;
  always @(posedge clk) half <= ~half;
  assign spin = ~spin;
  assign tick = half | spin;
endmodule
"""

# One second from a 50 MHz oscillator, high for one input cycle less than half of it.
SECOND = """\
module second (input clk, input rst, output tick);
  reg [31:0] count;
  always @(posedge clk)
    if (rst) count <= 32'd0;
    else if (count == 32'd49999999) count <= 32'd0;
    else count <= count + 32'd1;
  assign tick = count < 32'd24999999;
endmodule
"""

# A ring of four flip-flops with nothing to start or mend it.
RING = """\
module ring (input clk, output tick);
  reg [3:0] q;
  always @(posedge clk) q <= {q[2:0], q[3]};
  assign tick = q[0];
endmodule
"""

# A maximal fifteen-bit shift register: a round of 32767 states, in which no two input cycles are alike.
SHIFT = """\
module shift (input clk, input rst, output tick);
  reg [14:0] q;
  always @(posedge clk)
    if (rst) q <= 15'd1;
    else q <= {q[13:0], q[14] ^ q[13]};
  assign tick = q[0];
endmodule
"""


def written(folder: Path, text: str) -> str:
    """The path of a file with that text."""
    path = folder / "divider.v"
    path.write_text(text, encoding="utf-8")
    return str(path)


def checked(folder: Path, text: str, ratio: str, **options: Any) -> Report:
    """The report on a text that is to divide by `ratio`."""
    return check([written(folder, text)], Spec(ratio=Fraction(ratio), **options))


def measured(folder: Path, text: str, **options: Any) -> Report:
    """The measurement of a text."""
    return measure([written(folder, text)], Spec(**options))
