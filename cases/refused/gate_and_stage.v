// One net driven by a gate and by a stage.
// check: --ratio 4
// error: tick driven twice here
// line: 13
module stage (input ck, output reg q);
  always @(posedge ck) q <= ~q;
endmodule

module gate_and_stage (input clk, output tick);
  wire half;
  stage first (.ck(clk), .q(half));
  stage second (.ck(half), .q(tick));
  buf again (tick, half);
endmodule
