// Eight-state Johnson counter of the published 4022 function table: carry high for the first half, 4 of 8.
// Anti-lock gate from memory: D3 = Q2 (Q1 + Q3); computed worst 5 clocks.
// check: --ratio 8 --output carry
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// reset: proved, held 0
// from reset: period 16, high 8
// loops: 1
// false loops: 0
// check: --ratio 8 --high 2 --output zero
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// reset: proved, held 0
// from reset: period 16, high 2
// loops: 1
// false loops: 0
// check: --ratio 8 --output carry --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
// check: --ratio 8 --output carry --within 10
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// reset: proved, held 0
// from reset: period 16, high 8
// loops: 1
// false loops: 0
module johnson_8 (input clk, input reset, output carry, output zero);
  reg [4:1] q;
  always @(posedge clk or posedge reset)
    if (reset) q <= 4'b0;
    else begin
      q <= {q[3:1], ~q[4]};
      q[3] <= q[2] & (q[1] | q[3]);
    end
  assign carry = ~q[4];
  assign zero = ~q[1] & ~q[4];
endmodule
