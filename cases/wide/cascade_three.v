// Three 16-bit counters in a row: divides by 60 000 cubed.
// The output is a compare of the last counter: from 16 383 to 16 384 it may pass by 32 767. What it goes to samples it.
// check: --ratio 216000000000000 --waive 'glitch-free=sampled'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
module cascade_three (input clk, input rst, output slow);
  reg [15:0] a, b, c;
  wire a_last = a >= 16'd59_999;
  wire b_last = b >= 16'd59_999;
  always @(posedge clk)
    if (rst) a <= 16'd0;
    else a <= a_last ? 16'd0 : a + 16'd1;
  always @(posedge clk)
    if (rst) b <= 16'd0;
    else if (a_last) b <= b_last ? 16'd0 : b + 16'd1;
  always @(posedge clk)
    if (rst) c <= 16'd0;
    else if (a_last && b_last) c <= c >= 16'd59_999 ? 16'd0 : c + 16'd1;
  assign slow = c >= 16'd30_000;
endmodule
