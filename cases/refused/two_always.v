// One register assigned in two always blocks.
// check: --ratio 4
// error: count assigned two always blocks here
// line: 8
module two_always (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  always @(posedge clk) if (count == 2'd3) count <= 2'd0;
  assign tick = count[1];
endmodule
