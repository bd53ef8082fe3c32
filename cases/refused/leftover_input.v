// An enable that is neither clock nor reset nor held.
// check: --ratio 4
// error: enable --hold
// line: 7
module leftover_input (
  input clk,
  input enable,
  output tick
);
  reg [1:0] count;
  always @(posedge clk) if (enable) count <= count + 2'd1;
  assign tick = count[1];
endmodule
