// The baud clock by 5 whose decode names every bit of the count, so that 7 is left to ripple on to 0; the
// reset is active high.
// unit delay: decode
// check: --ratio 5
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 5, exact
// settling: proved, obligation
// reset: proved, held 2
// from reset: period 10, high 5
// loops: 1
// false loops: 0
// check: --ratio 5 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 5, exact
// settling: proved, obligation
// reset: proved, held 2
// loops: 1
// false loops: 0
module toggle_stage (input ck, input clear, output reg q);
  always @(negedge ck or posedge clear)
    if (clear) q <= 1'b0;
    else q <= ~q;
endmodule

module baud_by_5_ripple_reset (input clk, input reset, output baud);
  wire clk_n, low, middle, middle_n, top, at_5, clear;
  reg late;
  not turn (clk_n, clk);
  not invert (middle_n, middle);
  toggle_stage stage0 (clk_n, clear, low);
  toggle_stage stage1 (low, clear, middle);
  toggle_stage stage2 (middle, clear, top);
  and decode (at_5, top, middle_n, low);
  or either (clear, at_5, reset);
  always @(negedge clk) late <= middle;
  or merge (baud, top, late);
endmodule
