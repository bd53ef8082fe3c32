// Two modules of one name.
// check: --ratio 4
// error: module_twice
// line: 11
module module_twice (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
endmodule

module module_twice (input clk, output tick);
  assign tick = clk;
endmodule
