// A block that is called combinational keeps its old value on one path.
// check: --ratio 4
// error: held every path always_comb
// line: 10
module latch_in_comb (input clk, output tick);
  reg [1:0] count;
  logic held;
  always_ff @(posedge clk) count <= count + 2'd1;
  always_comb
    if (!clk) held = count[1];
  assign tick = held;
endmodule
