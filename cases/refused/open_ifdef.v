// A conditional that is never closed.
// check: --ratio 4
// error: ifdef
// line: 6
module open_ifdef (input clk, output tick);
`ifdef FAST
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
endmodule
