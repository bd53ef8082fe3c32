// A part select that runs against its vector.
// check: --ratio 4
// error: count
// line: 8
module part_select_reversed (input clk, output tick);
  reg [3:0] count;
  always @(posedge clk) count <= count + 4'd1;
  assign tick = ^count[1:2];
endmodule
