// A width of zero makes the range [-1:0], which is two bits by the letter and none by intent.
// check: --ratio 4
// error: count
// line: 6
module zero_width_range #(parameter WIDTH = 0) (input clk, output tick);
  reg [WIDTH-1:0] count;
  always @(posedge clk) count <= count + 1'b1;
  assign tick = count[0];
endmodule
