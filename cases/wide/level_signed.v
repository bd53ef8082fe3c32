// A signed counter from -6 000 000 to 5 999 999; its sign is the output.
// check: --ratio 12000000
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 21554432, exact
// settling: proved
// reset: proved, held 2
// from reset: period 24000000, high 12000000
module level_signed (input clk, input rst, output sign);
  reg signed [24:0] level;
  always @(posedge clk)
    if (rst) level <= -25'sd6_000_000;
    else if (level >= 25'sd5_999_999) level <= -25'sd6_000_000;
    else level <= level + 25'sd1;
  assign sign = level < 0;
endmodule
