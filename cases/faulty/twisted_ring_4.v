// Twisted ring of 4 stages without correction or reset. Its other loop is as long as the right one and has
// the wrong wave.
// check: --ratio 8
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 2
// false loops: 1
module twisted_ring_4 (input clk, output valve);
  reg [3:0] ring;
  always @(posedge clk) ring <= {ring[2:0], ~ring[3]};
  assign valve = ring[3];
endmodule
