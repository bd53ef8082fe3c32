// Sampling clock of the gauge, its divisor set on the fly: it is taken over only where a half period ends, into a
// register that the count is compared with. However it moves, each pulse has the length that one value gives it, and
// the new ratio holds once the pulse at hand has run out: 2^(W+1) − 2 half-cycles after the move at the latest.
// check: --moving div --ratio 2*(div+1)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 30, exact
// settling: proved
// reset: proved, held 2
// ratio-change: proved, back 30, exact
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module sample_wrap #(parameter W = 4) (
  input wire clk, rst, input wire [W-1:0] div, output reg sample
);
  reg [W-1:0] count, limit;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      limit <= div;
      sample <= 1'b0;
    end else if (count == limit) begin
      count <= 0;
      limit <= div;
      sample <= ~sample;
    end else count <= count + 1'b1;
endmodule
