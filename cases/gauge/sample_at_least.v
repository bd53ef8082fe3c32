// The same clock with the divisor compared as it stands, by >=: a limit that is lowered below the count ends the pulse
// with the next edge, so that its length lies between the old and the new one, and the next one is right.
// check: --moving div --ratio 2*(div+1)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// ratio-change: proved, back 0, exact
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --set W=24 --moving div=0..3 --ratio 2*(div+1)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// ratio-change: proved, back 0
// at: div=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module sample_at_least #(parameter W = 4) (
  input wire clk, rst, input wire [W-1:0] div, output reg sample
);
  reg [W-1:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      sample <= 1'b0;
    end else if (count >= div) begin
      count <= 0;
      sample <= ~sample;
    end else count <= count + 1'b1;
endmodule
