// Debounce clock of the tipping bucket: a down-counter that reloads at zero, initial values in the
// declarations, the output high for the last four counts.
// check: --ratio 10 --high 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 12, exact
// settling: proved
// from initial: period 20, high 8
// loops: 1
// false loops: 0
// check: --ratio 10 --high 8 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 12, exact
// settling: proved
// loops: 1
// false loops: 0
module bucket_by_10_down (input clk, output debounce);
  reg [3:0] left = 4'd9;
  reg level = 0;
  always @(posedge clk) begin
    left <= left - 4'd1;
    if (left == 4'd0) left <= 4'd9;
    level <= left >= 4'd1 && left <= 4'd4;
  end
  assign debounce = level;
endmodule
