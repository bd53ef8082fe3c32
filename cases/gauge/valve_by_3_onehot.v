// Valve clock by 3 from a one-hot ring of six, decoded by an OR of two stages that are not neighbours: at each
// step one of the two moves at most, for a high run of one cycle is followed by a low one.
// check: --ratio 3 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// loops: 1
// false loops: 0
module valve_by_3_onehot (input clk, output valve);
  reg [5:0] ring;
  always @(posedge clk) ring <= {ring[4:0], ~|ring[4:0]};
  assign valve = ring[0] | ring[3];
endmodule
