// Two outputs, and neither is named.
// check: --ratio 4
// error: output tick tock
// line: 5
module several_outputs (input clk, output reg tick, output reg tock);
  always @(posedge clk) tick <= ~tick;
  always @(posedge clk) tock <= tick ^ tock;
endmodule
