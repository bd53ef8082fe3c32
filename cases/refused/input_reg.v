// An input declared reg.
// check: --ratio 4
// error: clk reg
// line: 6
module input_reg (
  input reg clk,
  output reg tick
);
  always @(posedge clk) tick <= ~tick;
endmodule
