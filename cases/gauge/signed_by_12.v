// A signed count from -6 to 5, whose sign is the output.
// check: --ratio 12
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// from reset: period 24, high 12
// loops: 1
// false loops: 0
// check: --ratio 12 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// loops: 1
// false loops: 0
module signed_by_12 (input clk, input rst, output sign);
  reg signed [3:0] count;
  always @(posedge clk)
    if (rst || count >= 5) count <= -4'sd6;
    else if (count < -6) count <= 4'sd0;
    else count <= count + 4'sd1;
  assign sign = count < 0;
endmodule
