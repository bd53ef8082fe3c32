// An enable that is declared, read, and nowhere driven.
// check: --ratio 4
// error: enable never driven
// line: 7
module floating_net (input clk, output tick);
  reg [1:0] count;
  wire enable;
  always @(posedge clk)
    if (enable) count <= count + 2'd1;
  assign tick = count[1];
endmodule
