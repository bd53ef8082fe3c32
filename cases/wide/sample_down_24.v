// Sampling clock of the gauge with a divisor of 24 bits that is taken over only where a half period ends: a count that
// runs down from it. The longest pulse that may be at hand when the divisor moves has 2^25 half-cycles; all but the
// last two of them may be to come, by the wrap of the count.
// check: --ratio 2*(div+1) --moving div
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 33554430, exact
// settling: proved
// reset: proved, obligation
// ratio-change: proved, back 33554430
module sample_down_24 (input wire clk, rst, input wire [23:0] div, output reg sample);
  reg [23:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= div;
      sample <= 1'b0;
    end else if (count == 24'd0) begin
      count <= div;
      sample <= ~sample;
    end else count <= count - 24'd1;
endmodule
