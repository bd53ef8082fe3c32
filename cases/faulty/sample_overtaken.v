// Sampling clock of the gauge that compares its divisor as it stands, by ==. Right for every value that stands still;
// but a smaller one overtakes the count, which then runs once round its register: with 24 bits 17 seconds at 1 MHz.
// check: --moving div --ratio 2*(div+1)
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 30, exact
// settling: proved
// reset: proved, held 2
// ratio-change: refuted, run 6
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --set W=24 --moving div=0..3 --ratio 2*(div+1)
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 33554430, exact
// settling: proved
// reset: proved, held 2
// ratio-change: refuted, run 6
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module sample_overtaken #(parameter W = 4) (
  input wire clk, rst, input wire [W-1:0] div, output reg sample
);
  reg [W-1:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      sample <= 1'b0;
    end else if (count == div) begin
      count <= 0;
      sample <= ~sample;
    end else count <= count + 1'b1;
endmodule
