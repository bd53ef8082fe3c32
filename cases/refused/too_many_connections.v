// Three connections by position to a stage of two ports.
// check: --ratio 4
// error: stage
// line: 10
module stage (input ck, output reg q);
  always @(posedge ck) q <= ~q;
endmodule

module too_many_connections (input clk, output tick);
  stage half (clk, tick, 1'b1);
endmodule
