// A real variable.
// check: --ratio 4
// error: real
// line: 6
module real_number (input clk, output reg tick);
  real level;
  always @(posedge clk) tick <= ~tick;
endmodule
