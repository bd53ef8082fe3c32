// A macro that is nowhere defined.
// check: --ratio 4
// error: LAST_COUNT
// line: 7
module undefined_macro (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= (count == `LAST_COUNT) ? 2'd0 : count + 2'd1;
  assign tick = count[1];
endmodule
