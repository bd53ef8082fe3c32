// Chops the supply of the level sonde at half the sampling clock: one flip-flop that toggles.
// check: --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
module chopper_by_2 (input sample_clk, output reg drive);
  always @(posedge sample_clk) drive <= ~drive;
endmodule
