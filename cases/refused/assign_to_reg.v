// A register driven by a continuous assignment.
// check: --ratio 4
// error: tick
// line: 8
module assign_to_reg (input clk, output reg tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
endmodule
