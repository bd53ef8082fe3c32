// The connection names a port that the stage does not have.
// check: --ratio 4
// error: reset_n
// line: 10
module stage (input ck, output reg q);
  always @(posedge ck) q <= ~q;
endmodule

module unknown_port (input clk, output tick);
  stage half (.ck(clk), .reset_n(1'b1), .q(tick));
endmodule
