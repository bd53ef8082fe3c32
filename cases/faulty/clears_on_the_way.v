// A quarter of the oscillator by a ripple counter that clears at 4, all three stages in the decode: on the way
// from 5 to 6 the count is 4 for a moment, and whether the clear sees that hangs on how fast its gate is. The
// figures are those of a clear that does.
// check: --ratio 4
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: refuted
// loops: 1
// false loops: 0
module clears_on_the_way (input clk, output tick);
  reg q0, q1, q2;
  wire clear;
  and at_4 (clear, ~q0, ~q1, q2);
  always @(negedge clk or posedge clear) if (clear) q0 <= 1'b0; else q0 <= ~q0;
  always @(negedge q0 or posedge clear) if (clear) q1 <= 1'b0; else q1 <= ~q1;
  always @(negedge q1 or posedge clear) if (clear) q2 <= 1'b0; else q2 <= ~q2;
  assign tick = q1;
endmodule
