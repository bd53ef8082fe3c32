// A loop whose step does not move.
// check: --ratio 4
// error: loop never ends
// line: 10
module endless_loop (input clk, output tick);
  reg [3:0] ring;
  integer i;
  always @(posedge clk) begin
    ring[0] <= ~ring[3];
    for (i = 0; i < 3; i = i)
      ring[i + 1] <= ring[i];
  end
  assign tick = ring[3];
endmodule
