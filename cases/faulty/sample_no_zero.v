// Sampling clock with its divisor on pins, meant to divide by 2·div, and by 2 where div is 0: the counter is compared
// with 1, so that 0 goes all the way round and divides by 32. Only that value fails.
// check: --each div --ratio 2*max(div,1)
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 0, obligation
// at: div=0
// from reset: period 64, high 32
// loops: 1
// false loops: 1
// check: --each div=1..15 --ratio 2*div
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 30, exact
// settling: proved
// reset: proved, held 0, obligation
// at: div=1
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module sample_no_zero (input clk, input rst_n, input [3:0] div, output reg sample);
  reg [3:0] left;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) begin
      left <= 4'd1;
      sample <= 1'b0;
    end else if (left == 4'd1) begin
      left <= div;
      sample <= ~sample;
    end else left <= left - 4'd1;
endmodule
