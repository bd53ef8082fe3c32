// A register declared twice.
// check: --ratio 4
// error: count
// line: 7
module declared_twice (input clk, output tick);
  reg [1:0] count;
  reg [2:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
endmodule
