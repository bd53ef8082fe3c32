// Valve clock by 4 held in a latch that the count's own low bit opens: it closes as the high bit changes, which
// needs the closing to come first.
// check: --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
module valve_by_4_latch (input clk, output valve);
  reg [1:0] count;
  reg held;
  always @(posedge clk) count <= count + 2'd1;
  always @* if (count[0]) held = count[1];
  assign valve = held;
endmodule
