// A port declared twice.
// check: --ratio 4
// error: rst
// line: 8
module port_twice (clk, rst, tick);
  input clk;
  input rst;
  input rst;
  output tick;
  reg tick;
  always @(posedge clk) if (rst) tick <= 1'b0; else tick <= ~tick;
endmodule
