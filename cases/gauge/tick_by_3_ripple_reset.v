// The sampling tick by 3 with the logger's active-low reset let into the clear of both stages and of the
// delay.
// unit delay: decode
// check: --ratio 3 --output tick
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved, obligation
// reset: proved, held 0
// from reset: period 6, high 3
// loops: 1
// false loops: 0
// check: --ratio 3 --high 2 --output upper
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved, obligation
// reset: proved, held 0
// from reset: period 6, high 2
// loops: 1
// false loops: 0
// check: --ratio 3 --output tick --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved, obligation
// reset: proved, held 0
// loops: 1
// false loops: 0
module toggle_stage (input ck, input clear_n, output reg q);
  always @(posedge ck or negedge clear_n)
    if (!clear_n) q <= 1'b0;
    else q <= ~q;
endmodule

module half_cycle_delay (input ck, input clear_n, input d, output reg q);
  always @(negedge ck or negedge clear_n)
    if (!clear_n) q <= 1'b0;
    else q <= d;
endmodule

module tick_by_3_ripple_reset (input clk, input reset_n, output tick, output upper);
  wire lower, lower_n, below_3, clear_n, late;
  toggle_stage stage0 (clk, clear_n, lower);
  not fall0 (lower_n, lower);
  toggle_stage stage1 (lower_n, clear_n, upper);
  nand decode (below_3, upper, lower);
  and clear_both (clear_n, below_3, reset_n);
  half_cycle_delay delay (clk, reset_n, upper, late);
  or merge (tick, upper, late);
endmodule
