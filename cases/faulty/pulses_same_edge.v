// Every second pulse of the oscillator, let through by a flip-flop on the very edge that begins the pulse: where the
// enable falls, the next pulse has begun before it, a sliver as long as the flip-flop takes.
// check: --ratio 2 --high 1
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
module pulses_same_edge (input clk, output pulses);
  reg enable;
  always @(posedge clk) enable <= ~enable;
  and gate (pulses, clk, enable);
endmodule
