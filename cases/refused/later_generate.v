// A generate loop, not read yet.
// check: --ratio 4
// error: generate
// line: 9
module later_generate (input clk, output tick);
  wire [2:0] chain;
  assign chain[0] = clk;
  genvar i;
  generate
    for (i = 0; i < 2; i = i + 1) begin : stage
      reg q;
      always @(negedge chain[i]) q <= ~q;
      assign chain[i + 1] = q;
    end
  endgenerate
  assign tick = chain[2];
endmodule
