// The file ends before the module does.
// check: --ratio 4
// error: syntax
module missing_end (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
