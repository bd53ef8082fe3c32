// The by-5 section of the published '390 function table alone (0 to 4; Q3 high 1 of 5), three stages
// without reset. The illegal counts 5, 6 and 7 go to 2, 2 and 0 in one clock (cell equations from memory).
// check: --ratio 5 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
module fifth_section (input cp_n, output q3);
  reg q1, q2, q3_state;
  always @(negedge cp_n) q1 <= ~q3_state & ~q1;
  always @(negedge q1) q2 <= ~q2;
  always @(negedge cp_n) q3_state <= q1 & q2 & ~q3_state;
  assign q3 = q3_state;
endmodule
