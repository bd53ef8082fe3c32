// A pump clock behind a gate whose enable moves on the very edge that opens it: the clock gets a sliver each
// time the enable falls.
// check: --ratio 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: refuted
// loops: 2
// false loops: 0
module gate_opened_by_its_clock (input clk, output pump);
  reg enable, level;
  always @(posedge clk) enable <= ~enable;
  wire gated = clk & enable;
  always @(posedge gated) level <= ~level;
  assign pump = level;
endmodule
