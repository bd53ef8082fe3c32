"""Programmable dividers drawn at random: each as Verilog, and as a map on its states written out by hand.

A counter of W bits moves up or down, is loaded with one thing when it compares with another, and the output toggles
there or decodes the counter. The two descriptions share nothing but the names of the operators.
"""

from __future__ import annotations

import random
from collections.abc import Callable
from dataclasses import dataclass

State = tuple[int, int, int]
"""Counter, output register, level of the clock."""

TERMS: dict[str, Callable[[int, int], int]] = {
    "{W{1'b0}}": lambda div, top: 0,
    "{{W-1{1'b0}}, 1'b1}": lambda div, top: 1,
    "{W{1'b1}}": lambda div, top: top,
    "div": lambda div, top: div,
    "div - 1'b1": lambda div, top: (div - 1) & top,
    "~div": lambda div, top: ~div & top,
    "div >> 1": lambda div, top: div >> 1,
}
COMPARES: dict[str, Callable[[int, int], bool]] = {
    "==": lambda a, b: a == b,
    ">=": lambda a, b: a >= b,
    "<=": lambda a, b: a <= b,
}


@dataclass(frozen=True)
class Plan:
    """One divider. `toggles`: the output is a register that toggles at the load, else `count < decoded`."""

    width: int
    up: bool
    compare: str
    limit: str
    load: str
    toggles: bool
    decoded: str
    reset: bool

    def verilog(self) -> str:
        """The divider as a module with the ports clk, rst, div and tick."""
        reset = "if (rst) begin count <= {W{1'b0}}; flip <= 1'b0; end else" if self.reset else ""
        output = "flip" if self.toggles else f"count < ({self.decoded})"
        return f"""\
module programmable #(parameter W = {self.width}) (input clk, input rst, input [W-1:0] div, output tick);
  reg [W-1:0] count;
  reg flip;
  always @(posedge clk) {reset} begin
    if (count {self.compare} ({self.limit})) begin
      count <= {self.load};
      flip <= ~flip;
    end else count <= count {"+" if self.up else "-"} 1'b1;
  end
  assign tick = {output};
endmodule
"""

    def step(self, state: State, div: int) -> State:
        """The state one half-cycle later."""
        count, flip, clock = state
        top = (1 << self.width) - 1
        if clock == 1:
            return (count, flip, 0)
        if COMPARES[self.compare](count, TERMS[self.limit](div, top)):
            return (TERMS[self.load](div, top), 1 - flip, 1)
        return ((count + (1 if self.up else -1)) & top, flip, 1)

    def output(self, state: State, div: int) -> int:
        """The output in a state."""
        return state[1] if self.toggles else int(state[0] < TERMS[self.decoded](div, (1 << self.width) - 1))

    def states(self) -> list[State]:
        """Every power-up state."""
        return [(c, f, k) for c in range(1 << self.width) for f in (0, 1) for k in (0, 1)]


def drawn(rng: random.Random, width: int) -> Plan:
    """A plan drawn at random."""
    return Plan(
        width=width,
        up=rng.random() < 0.5,
        compare=rng.choice(list(COMPARES)),
        limit=rng.choice(list(TERMS)),
        load=rng.choice(list(TERMS)),
        toggles=rng.random() < 0.5,
        decoded=rng.choice(list(TERMS)),
        reset=rng.random() < 0.7,
    )
