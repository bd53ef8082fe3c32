// Valve clock from a one-hot ring of 90 stages, more than a machine word holds: high while the one is in the lower
// half. Nothing restores the one once it is lost, and where it crosses from one half to the other the OR may pulse.
// check: --ratio 90
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: refuted, held 0
// from reset: period 180, high 90
module valve_by_90_ring (input clk, input rst, output valve);
  reg [89:0] ring;
  always @(posedge clk or posedge rst)
    if (rst) ring <= 90'd1;
    else ring <= {ring[88:0], ring[89]};
  assign valve = |ring[44:0];
endmodule
