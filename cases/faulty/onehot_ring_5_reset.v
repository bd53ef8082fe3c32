// A five-stage one-hot ring with a reset that sets the first stage. From reset it is right, and an upset is waived: the
// logger resets the ring often. But where one of the two stages that move first sees the release an edge later than the
// other, two ones or none go round from then on.
// check: --ratio 5 --high 2 --waive 'recovery=the logger resets the ring' --waive 'no-stuck=the logger resets the ring'
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: period 10, high 2
// loops: 8
// false loops: 7
// stuck: yes
module onehot_ring_5_reset (input clk, input rst_n, output valve);
  reg [4:0] ring;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) ring <= 5'b00001;
    else ring <= {ring[3:0], ring[4]};
  assign valve = ring[0];
endmodule
