// The sampling tick by 3 with an AND where the NAND belongs: the stages are cleared at every count but 3,
// and the output stays at zero.
// unit delay: decode
// check: --ratio 3
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: refuted
// recovery: refuted
// settling: proved
// loops: 1
// false loops: 1
// stuck: yes
module toggle_stage (input ck, input clear_n, output reg q);
  always @(posedge ck or negedge clear_n)
    if (!clear_n) q <= 1'b0;
    else q <= ~q;
endmodule

module half_cycle_delay (input ck, input d, output reg q);
  always @(negedge ck) q <= d;
endmodule

module decode_upside_down (input clk, output tick);
  wire q0, q0_n, q1, clear_n, late;
  toggle_stage stage0 (clk, clear_n, q0);
  not fall0 (q0_n, q0);
  toggle_stage stage1 (q0_n, clear_n, q1);
  and decode (clear_n, q1, q0);
  half_cycle_delay delay (clk, q1, late);
  or merge (tick, q1, late);
endmodule
