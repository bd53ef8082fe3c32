// Sampling tick of the river gauge, a third of the oscillator at 50 %: two toggle stages ripple and are
// cleared by the decode of their own count of 3; the upper stage, OR-ed with itself half a cycle late, is
// the tick. No reset.
// unit delay: decode
// check: --ratio 3 --output tick
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
// check: --ratio 3 --high 2 --output upper
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
module toggle_stage (input ck, input clear_n, output reg q);
  always @(posedge ck or negedge clear_n)
    if (!clear_n) q <= 1'b0;
    else q <= ~q;
endmodule

module half_cycle_delay (input ck, input d, output reg q);
  always @(negedge ck) q <= d;
endmodule

module tick_by_3_ripple (input clk, output tick, output upper);
  wire lower, lower_n, clear_n, late;
  toggle_stage stage0 (.ck(clk), .clear_n(clear_n), .q(lower));
  not fall0 (lower_n, lower);
  toggle_stage stage1 (.ck(lower_n), .clear_n(clear_n), .q(upper));
  nand decode (clear_n, upper, lower);
  half_cycle_delay delay (.ck(clk), .d(upper), .q(late));
  or merge (tick, upper, late);
endmodule
