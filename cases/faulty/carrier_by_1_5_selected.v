// The sonde's carrier by 1.5, two of three half-cycles high, from a part on each edge with the clock as the selector:
// where the clock selects the part that it is about to raise, the old value comes through first. The wave at rest is
// right, and the ratio with it.
// check: --ratio 1.5 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 1, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
module carrier_by_1_5_selected (input clk, output carrier);
  reg [1:0] count;
  reg after_rise, after_fall;
  always @(posedge clk) begin
    count <= count >= 2'd2 ? 2'd0 : count + 2'd1;
    after_rise <= count != 2'd1;
  end
  always @(negedge clk) after_fall <= count != 2'd0;
  assign carrier = clk ? after_rise : after_fall;
endmodule
