// Sampling clock of the gauge that counts whole periods and decodes the half of them into a flip-flop, by the divisor
// as it stands. Where it moves the decode may change its mind within a period, and pulses are cut short.
// check: --moving div --ratio 2*(div+1)
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 2, obligation
// ratio-change: refuted, run 8
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --set W=8 --moving div=0..3 --ratio 2*(div+1)
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 2, obligation
// ratio-change: refuted, run 8
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module sample_chopped #(parameter W = 4) (
  input wire clk, rst, input wire [W-1:0] div, output reg sample
);
  reg [W:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      sample <= 1'b0;
    end else begin
      count <= count >= {div, 1'b1} ? 0 : count + 1'b1;
      sample <= count <= div;
    end
endmodule
