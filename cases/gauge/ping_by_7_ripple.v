// Repetition clock of the ultrasonic level pinger, a seventh of the oscillator at 50 %: three toggle stages
// ripple and are cleared by the decode of their own count of 7; the top stage is OR-ed with itself half a
// cycle late. No reset.
// unit delay: decode
// check: --ratio 7 --output ping
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved, obligation
// loops: 1
// false loops: 0
// check: --ratio 7 --high 6 --output top
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

module ping_by_7_ripple (input clk, output ping, output top);
  wire q0, q0_n, q1, q1_n, clear_n, late;
  toggle_stage stage0 (.ck(clk), .clear_n(clear_n), .q(q0));
  toggle_stage stage1 (.ck(q0_n), .clear_n(clear_n), .q(q1));
  toggle_stage stage2 (.ck(q1_n), .clear_n(clear_n), .q(top));
  not fall0 (q0_n, q0);
  not fall1 (q1_n, q1);
  nand decode (clear_n, top, q1, q0);
  half_cycle_delay delay (.ck(clk), .d(top), .q(late));
  or merge (ping, top, late);
endmodule
