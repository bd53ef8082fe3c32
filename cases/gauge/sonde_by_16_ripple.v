// Four toggle stages rippling on falling edges, without reset or clear: by 16, every state on the one loop.
// check: --ratio 16 --output q3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 2 --output q0
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 8 --output q2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
module fall_toggle (input ck, output reg q);
  always @(negedge ck) q <= !q;
endmodule

module sonde_by_16_ripple (input clk, output q0, q1, q2, q3);
  fall_toggle stage0 (clk, q0);
  fall_toggle stage1 (q0, q1);
  fall_toggle stage2 (q1, q2);
  fall_toggle stage3 (q2, q3);
endmodule
