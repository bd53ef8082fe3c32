// A for loop, not read yet.
// check: --ratio 4
// error: for
// line: 10
module later_for (input clk, output tick);
  reg [3:0] ring;
  integer i;
  always @(posedge clk) begin
    ring[0] <= ~ring[3];
    for (i = 1; i < 4; i = i + 1) ring[i] <= ring[i - 1];
  end
  assign tick = ring[3];
endmodule
