// Self-clearing ripple counter by 6: the count of 6 lasts no time at all (published worked example: ten
// visits in 60 input cycles).
// unit delay: at_6
// check: --ratio 6 --high 4 --output q2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
// check: --ratio 2 --output q0
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
module stage (input ck_n, input clear, output reg q);
  always @(negedge ck_n or posedge clear)
    if (clear) q <= 1'b0;
    else q <= ~q;
endmodule

module sixth_self_clearing (input clk, output q0, output q2);
  wire q1, at_6;
  stage s0 (clk, at_6, q0);
  stage s1 (q0, at_6, q1);
  stage s2 (q1, at_6, q2);
  assign at_6 = q2 & q1;
endmodule
