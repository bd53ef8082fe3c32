// A number of no bits.
// check: --ratio 4
// error: 0'd1
// line: 7
module zero_size_number (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 0'd1;
  assign tick = count[1];
endmodule
