// Two bi-quinary decades in a row (composition by 100 of the published '390 table), 50 % at the last stage,
// no reset.
// check: --ratio 100
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 20, exact
// settling: proved
// loops: 1
// false loops: 0
module fifth (input cp_n, output reg q1, output reg q2, output reg q3);
  always @(negedge cp_n) {q3, q1} <= {q1 & q2 & ~q3, ~q3 & ~q1};
  always @(negedge q1) q2 <= ~q2;
endmodule

module half (input cp_n, output reg q0);
  always @(negedge cp_n) q0 <= ~q0;
endmodule

module hundredth (input clk, output last);
  wire units, tens, a, b, c, d;
  fifth section0 (clk, a, b, units);
  half section1 (units, tens);
  wire by_fifty;
  fifth section2 (tens, c, d, by_fifty);
  half section3 (by_fifty, last);
endmodule
