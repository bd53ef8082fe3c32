// A file to include that is not there.
// check: --ratio 4
// error: no_such_rates.vh
// line: 5
`include "no_such_rates.vh"
module include_not_found (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = count[1];
endmodule
