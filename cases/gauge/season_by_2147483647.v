// The slowest tick of the logger, the oscillator divided by 2^31 - 1 at 50 % on both edges, in a 32-bit
// counter.
// check: --ratio 2147483647
// verdict: proved or open
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: proved or open, worst 3, exact
// settling: proved
// reset: proved, held 3, obligation
// from reset: period 4294967294, high 2147483647
module season_by_2147483647 (input clk, input rst, output slow);
  reg [31:0] count;
  reg first, late;
  always @(posedge clk)
    if (rst || count >= 32'd2_147_483_646) count <= 32'd0;
    else count <= count + 32'd1;
  always @(posedge clk)
    first <= !rst && count < 32'd1_073_741_823;
  always @(negedge clk)
    late <= first;
  assign slow = first | late;
endmodule
