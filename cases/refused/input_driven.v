// An input that the module drives itself.
// check: --ratio 4
// error: rst
// line: 6
module input_driven (input clk, input rst, output reg tick);
  assign rst = 1'b0;
  always @(posedge clk) if (rst) tick <= 1'b0; else tick <= ~tick;
endmodule
