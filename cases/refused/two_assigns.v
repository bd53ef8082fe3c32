// One net driven by two assignments.
// check: --ratio 4
// error: tick driven twice here
// line: 9
module two_assigns (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
  assign tick = count[0];
endmodule
