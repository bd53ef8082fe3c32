// Plain one-hot ring of four stages: dead at 0000 and at 1111, and false loops for two and three hot
// stages.
// check: --ratio 4 --high 2
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: refuted
// recovery: refuted
// settling: proved
// loops: 6
// false loops: 5
// stuck: yes
module onehot_ring_4 (input clk, output valve);
  reg [3:0] ring;
  always @(posedge clk) ring <= {ring[2:0], ring[3]};
  assign valve = ring[0];
endmodule
