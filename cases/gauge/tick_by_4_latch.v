// Sampling tick by 4 whose decode passes a latch that is open while the clock is low, as in front of a clock gate:
// the tick is half a cycle later than the count.
// check: --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 1, exact
// settling: proved
// loops: 1
// false loops: 0
module tick_by_4_latch (input clk, output tick);
  reg [1:0] count;
  reg held;
  always @(posedge clk) count <= count + 2'd1;
  always @* if (!clk) held = count[1];
  assign tick = held;
endmodule
