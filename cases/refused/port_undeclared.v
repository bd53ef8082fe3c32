// A port that is listed and never declared.
// check: --ratio 4
// error: rst
// line: 5
module port_undeclared (clk, rst, tick);
  input clk;
  output tick;
  reg tick;
  always @(posedge clk) tick <= ~tick;
endmodule
