// A comment that is never closed.
// check: --ratio 4
// error: comment
// line: 9
module open_comment (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
  /* the tick of the gauge
endmodule
