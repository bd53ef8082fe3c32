// A valve clock held in a latch that a decode of three bits opens: while these change together the decode may
// open it at a wrong count.
// check: --ratio 8
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: refuted, obligation
// loops: 1
// false loops: 0
module latch_behind_a_decode (input clk, output valve);
  reg [2:0] count;
  reg held;
  always @(posedge clk) count <= count + 3'd1;
  wire open = count == 3'd3 | count == 3'd7;
  always @* if (open) held = count[2];
  assign valve = held;
endmodule
