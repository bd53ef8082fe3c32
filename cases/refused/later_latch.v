// A latch by an incomplete combinational block, not read yet.
// check: --ratio 4
// error: latch held
// line: 9
module later_latch (input clk, output tick);
  reg [1:0] count;
  reg held;
  always @(posedge clk) count <= count + 2'd1;
  always @* if (!clk) held = count[1];
  assign tick = held;
endmodule
