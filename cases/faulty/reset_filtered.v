// A gate clock by 8 behind a filter: the counter is cleared only where the reset line is high at three rising edges in a
// row. Two input cycles of reset are one too few; the counter then runs through, and the first edges come anywhere. Three
// rising edges take 5 half-cycles from a low clock, and 6 from a high one.
// check: --ratio 8 --reset rst=1 --reset-cycles 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: refuted, held 6
// from reset: period 16, high 8
// loops: 1
// false loops: 0
// check: --ratio 8 --reset rst=1 --reset-cycles 3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 6
// from reset: period 16, high 8
// loops: 1
// false loops: 0
// check: --ratio 8 --reset rst=1
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 6
// from reset: period 16, high 8
// loops: 1
// false loops: 0
module reset_filtered (input clk, input rst, output pulse);
  reg [1:0] seen;
  reg [2:0] count;
  always @(posedge clk) begin
    seen <= {seen[0], rst};
    if (rst & (&seen)) count <= 3'd0;
    else count <= count + 3'd1;
  end
  assign pulse = count[2];
endmodule
