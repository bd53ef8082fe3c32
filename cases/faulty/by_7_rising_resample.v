// The pinger's clock by 7 as a structure whose delay samples on the rising edge: high for 8 of 14 half-
// cycles instead of 7.
// Where the delay misses a count (a good state that reset never leads to) it sets as the top stage is cleared,
// and has to come first.
// unit delay: decode
// check: --ratio 7
// verdict: refuted
// ratio: proved
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved, obligation
// reset: refuted, held 2
// from reset: period 14, high 8
// loops: 1
// false loops: 1
// check: --ratio 7 --high 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved, obligation
// glitch-free: proved, obligation
// reset: proved, held 2
// from reset: period 14, high 8
// loops: 1
// false loops: 0
module toggle_stage (input ck, input clear_n, output reg q);
  always @(posedge ck or negedge clear_n)
    if (!clear_n) q <= 1'b0;
    else q <= ~q;
endmodule

module by_7_rising_resample (input clk, input rst_n, output ping);
  wire q0, q1, q2, q0_n, q1_n, below_7, clear_n;
  reg late;
  toggle_stage stage0 (clk, clear_n, q0);
  toggle_stage stage1 (q0_n, clear_n, q1);
  toggle_stage stage2 (q1_n, clear_n, q2);
  not fall0 (q0_n, q0), fall1 (q1_n, q1);
  nand decode (below_7, q2, q1, q0);
  and clear_all (clear_n, below_7, rst_n);
  always @(posedge clk) late <= q2;
  or merge (ping, q2, late);
endmodule
