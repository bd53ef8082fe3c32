// The twisted ring that loads 10...0 when its first and last stage are both 0 (the textbook's self-correcting counter,
// from memory): worst recovery n - 1 clocks until the code is legal, and 2(n - 2) half-cycles until the wave is.
// check: --ratio 128
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 124, exact
// settling: proved
// reset: proved, held 2
module ring_64_twisted_fixed (input clk, input rst, output slow);
  reg [63:0] ring;
  always @(posedge clk)
    if (rst) ring <= 64'd0;
    else if (!ring[0] && !ring[63]) ring <= 64'd1;
    else ring <= {ring[62:0], ~ring[63]};
  assign slow = ring[0];
endmodule
