// A bucket count by 20 that counts down in four bits: the reload of 19 is 3, and it divides by 4.
// check: --ratio 20 --high 2
// verdict: refuted
// ratio: refuted
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 1
// false loops: 1
// note: 25: constant 19 is cut to 4 bits and becomes 3
// check: --ratio 4 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 24, exact
// settling: proved
// loops: 1
// false loops: 0
// note: 25: constant 19 is cut to 4 bits and becomes 3
module truncated_reload (input clk, output tick);
  reg [3:0] left;
  always @(posedge clk)
    if (left == 4'd0) left <= 19;
    else left <= left - 4'd1;
  assign tick = left == 4'd0;
endmodule
