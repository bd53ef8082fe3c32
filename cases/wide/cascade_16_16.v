// A 16-bit prescaler enables a 16-bit counter: divides by 50 000 * 40 000.
// The prescaler compares by ==, so from 50 000 it counts on to 65 535 and misses 15 536 input cycles before it is back
// at 0. That lengthens a whole run of the output by as much if the coarse counter is at 20 000 (or 0) meanwhile: 31 072
// half-cycles. A coarse counter beyond its end shows what 39 999 shows.
// The output is a compare: from 16 383 to 16 384 it may pass by 32 767. What it goes to samples it.
// check: --ratio 2000000000 --waive 'glitch-free=sampled'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 31072, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
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
