// Twisted ring of 5 stages without correction or reset. Two other loops of 10 states and one of 2 states
// (01010) wait beside the right one.
// check: --ratio 10
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 4
// false loops: 3
module twisted_ring_5 (input clk, output valve);
  reg [4:0] ring;
  always @(posedge clk) ring <= {ring[3:0], ~ring[4]};
  assign valve = ring[4];
endmodule
