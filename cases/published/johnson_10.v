// Ten-state Johnson counter of the published 4017 function table: carry high for the first half, 5 of 10;
// each decoded output 1 of 10. Anti-lock gate from memory: D3 = Q2 (Q1 + Q3). Its data sheet promises home
// within 11 clocks.
// check: --ratio 10 --output carry
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 16, exact
// settling: proved
// reset: proved, held 0
// from reset: period 20, high 10
// loops: 1
// false loops: 0
// check: --ratio 10 --high 2 --output zero
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 16, exact
// settling: proved
// reset: proved, held 0
// from reset: period 20, high 2
// loops: 1
// false loops: 0
// check: --ratio 10 --output carry --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 16, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
// check: --ratio 10 --output carry --within 22
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 16, exact
// settling: proved
// reset: proved, held 0
// from reset: period 20, high 10
// loops: 1
// false loops: 0
module johnson_10 (input clk, input reset, output carry, output zero);
  reg [5:1] q;
  always @(posedge clk or posedge reset)
    if (reset) q <= 5'b0;
    else begin
      q <= {q[4:1], ~q[5]};
      q[3] <= q[2] & (q[1] | q[3]);
    end
  assign carry = ~q[5];
  assign zero = ~q[1] & ~q[5];
endmodule
