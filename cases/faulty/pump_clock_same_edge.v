// The input clock for the sampling pump's drive, gated by the enable from a flip-flop on the clock's own rising edge:
// at the edge that stops it the clock is through before the flip-flop shuts the gate.
// check: --ratio 1 --moving run
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 1, exact
// settling: proved
// glitch-free: proved
// reset: proved, held 2
// enable: refuted, run 4
// from reset: period 2, high 1
// loops: 1
// false loops: 0
module pump_clock_same_edge (input wire clk, rst, run, output wire pump);
  reg held;
  always @(posedge clk) held <= run & ~rst;
  assign pump = clk & held;
endmodule
