// Four-stage twisted ring that loads 1000 when its first and last stage are empty: by 8 at 50 %, home from
// every pattern.
// check: --ratio 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 8 --within 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
module valve_by_8_twisted (input clk, output valve);
  reg q1, q2, q3, q4;
  always @(posedge clk)
    if (!q1 && !q4) {q1, q2, q3, q4} <= 4'b1000;
    else {q1, q2, q3, q4} <= {~q4, q1, q2, q3};
  assign valve = q4;
endmodule
