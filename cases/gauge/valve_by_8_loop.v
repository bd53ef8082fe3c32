// Four-phase valve driver by 8: a twisted ring moved along by a for loop, with the load of 1000 when its first
// and last stage are empty that brings every code home.
// check: --ratio 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// loops: 1
// false loops: 0
module valve_by_8_loop (input clk, output valve);
  reg [3:0] ring;
  integer i;
  always @(posedge clk) begin
    ring[0] <= ~ring[3];
    for (i = 1; i < 4; i = i + 1)
      ring[i] <= ring[i - 1] & (ring[0] | ring[3]);
  end
  assign valve = ring[0];
endmodule
