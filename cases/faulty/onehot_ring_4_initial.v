// The one-hot ring of four stages with a declared initial value: right from power-up, and no way back from
// an upset.
// check: --ratio 4 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// from initial: period 8, high 2
// loops: 6
// false loops: 5
// stuck: yes
// check: --ratio 4 --high 2 --waive no-stuck=initial --waive recovery=initial
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// from initial: period 8, high 2
// loops: 6
// false loops: 5
// stuck: yes
module onehot_ring_4_initial (input clk, output valve);
  reg [3:0] ring = 4'b0001;
  always @(posedge clk) ring <= {ring[2:0], ring[3]};
  assign valve = ring[3];
endmodule
