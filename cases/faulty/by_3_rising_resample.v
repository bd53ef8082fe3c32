// The sampling tick by 3 whose delay samples on the rising edge: the tick is a whole cycle longer than its
// upper stage instead of half a cycle. The ratio stands, the high time is 4 of 6 half-cycles.
// The OR holds the tick up only if the delay, which the clock sets, comes before the clearing that ripples.
// unit delay: decode
// check: --ratio 3
// verdict: refuted
// ratio: proved
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved, obligation
// glitch-free: proved, obligation
// loops: 1
// false loops: 1
// check: --ratio 3 --high 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved, obligation
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
module toggle_stage (input ck, input clear_n, output reg q);
  always @(posedge ck or negedge clear_n)
    if (!clear_n) q <= 1'b0;
    else q <= ~q;
endmodule

module by_3_rising_resample (input clk, output tick);
  wire q0, q0_n, q1, clear_n;
  reg late;
  toggle_stage stage0 (clk, clear_n, q0);
  not fall0 (q0_n, q0);
  toggle_stage stage1 (q0_n, clear_n, q1);
  nand decode (clear_n, q1, q0);
  always @(posedge clk) late <= q1;
  or merge (tick, q1, late);
endmodule
