// Baud clock of the telemetry modem, a fifth of the oscillator at 50 %: three toggle stages ripple and are
// cleared by the decode of their own count of 5; the top stage is OR-ed with the middle one half a cycle
// late. No reset.
// unit delay: decode
// check: --ratio 5 --output baud
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
// check: --ratio 5 --high 2 --output top
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
// check: --ratio 5 --high 4 --output middle
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
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

module baud_by_5_ripple (input clk, output baud, output top, output middle);
  wire low, low_n, middle_n, clear_n, late;
  nand decode (clear_n, top, low);
  not fall0 (low_n, low), fall1 (middle_n, middle);
  toggle_stage stage0 (.q(low), .ck(clk), .clear_n(clear_n));
  toggle_stage stage1 (.q(middle), .ck(low_n), .clear_n(clear_n));
  toggle_stage stage2 (.q(top), .ck(middle_n), .clear_n(clear_n));
  half_cycle_delay delay (.ck(clk), .d(middle), .q(late));
  or merge (baud, top, late);
endmodule
