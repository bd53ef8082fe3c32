// The pinger's clock, meant to be by 7, with one input of the decode left off: it clears at 6, so it
// divides by 6 and is high for 5 of 12 half-cycles.
// unit delay: decode
// check: --ratio 7
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved, obligation
// loops: 1
// false loops: 1
// check: --ratio 6 --high 5
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

module by_7_clears_at_6 (input clk, output ping);
  wire q0, q0_n, q1, q1_n, q2, clear_n, late;
  toggle_stage stage0 (.ck(clk), .clear_n(clear_n), .q(q0));
  toggle_stage stage1 (.ck(q0_n), .clear_n(clear_n), .q(q1));
  toggle_stage stage2 (.ck(q1_n), .clear_n(clear_n), .q(q2));
  not fall0 (q0_n, q0);
  not fall1 (q1_n, q1);
  nand decode (clear_n, q2, q1);
  half_cycle_delay delay (.ck(clk), .d(q2), .q(late));
  or merge (ping, q2, late);
endmodule
