// Sampling clock of the gauge's pressure cell, its divisor on pins: a down-counter that is loaded only at its wrap
// toggles the output, so it divides by 2·(div + 1) for every value, 0 among them. From power-up the counter runs down
// from wherever it is: with div = 0 and all ones in the counter it takes longest.
// check: --each div --ratio 2*(div+1)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 30, exact
// settling: proved
// reset: proved, held 0, obligation
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --set W=8 --each div=3..255 --ratio 2*(div+1) --high 2*div+2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 504, exact
// settling: proved
// reset: proved, held 0, obligation
// at: div=3
// from reset: period 16, high 8
// loops: 1
// false loops: 0
// check: --set W=24 --each div --ratio 2*(div+1)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 33554430, exact
// settling: proved
// reset: proved, held 0, obligation
// at: div=0
// from reset: period 4, high 2
// check: --each div=4,6..8 --ratio 2*(div+W-3)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 22, exact
// settling: proved
// reset: proved, held 0, obligation
// at: div=4
// from reset: period 20, high 10
// loops: 1
// false loops: 0
module sample_by_div #(parameter W = 4) (
  input clk, input rst_n, input [W-1:0] div, output reg sample
);
  reg [W-1:0] left;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) begin
      left <= {W{1'b0}};
      sample <= 1'b0;
    end else if (left == {W{1'b0}}) begin
      left <= div;
      sample <= ~sample;
    end else left <= left - 1'b1;
endmodule
