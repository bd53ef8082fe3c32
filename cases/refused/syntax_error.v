// An operand is missing in the count of the sampling tick.
// check: --ratio 4
// error: syntax
// line: 7
module syntax_error (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + * 2'd1;
  assign tick = count[1];
endmodule
