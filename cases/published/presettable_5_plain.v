// The five-stage counter without its anti-lock gate: by 6, 8 and 10 have 8, 16 and 22 states of 32 that
// never recover.
// check: --set TAP=1 --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=2 --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=3 --ratio 6
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 2
// false loops: 1
// check: --set TAP=4 --ratio 8
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 2
// false loops: 1
// check: --set TAP=5 --ratio 10
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 4
// false loops: 3
module presettable_5_plain #(parameter TAP = 5) (input clk, output q1);
  reg [5:1] q;
  always @(posedge clk) q <= {q[4:1], ~q[TAP]};
  assign q1 = q[1];
endmodule
