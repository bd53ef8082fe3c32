// A bucket count by 20 that counts down in four bits: the reload of 19 is 3, and it divides by 4.
// From 2 to 1 the decode passes by 0; the tick enables what it goes to.
// check: --ratio 20 --high 2
// verdict: refuted
// ratio: refuted
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 1
// note: 28: constant 19 is cut to 4 bits and becomes 3
// check: --ratio 4 --high 2 --waive 'glitch-free=an enable'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 24, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
// note: 28: constant 19 is cut to 4 bits and becomes 3
module truncated_reload (input clk, output tick);
  reg [3:0] left;
  always @(posedge clk)
    if (left == 4'd0) left <= 19;
    else left <= left - 4'd1;
  assign tick = left == 4'd0;
endmodule
