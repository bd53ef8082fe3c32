// By 4.5 from a nine-stage one-hot ring, (1 or 2) OR half a cycle late (5 or 6): 4 of 9 half-cycles high
// (published example, values computed). The plain ring has no way back from an upset.
// Where stage 1 hands over to stage 2 the OR may dip.
// check: --ratio 4.5 --high 4
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 9, high 4
// loops: 60
// false loops: 59
// stuck: yes
// check: --ratio 4.5 --high 4 --waive no-stuck=preset --waive recovery=preset --waive 'glitch-free=a one-hot handover'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 9, high 4
// loops: 60
// false loops: 59
// stuck: yes
module ring_by_4_5 (input clk, output out);
  reg [1:9] ff = 9'b1_0000_0000;
  reg late = 0;
  always @(posedge clk) ff <= {ff[9], ff[1:8]};
  always @(negedge clk) late <= ff[5] | ff[6];
  assign out = ff[1] | ff[2] | late;
endmodule
