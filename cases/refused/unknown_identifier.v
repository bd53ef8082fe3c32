// A limit that is nowhere declared.
// check: --ratio 4
// error: LAST
// line: 7
module unknown_identifier (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= (count == LAST) ? 2'd0 : count + 2'd1;
  assign tick = count[1];
endmodule
