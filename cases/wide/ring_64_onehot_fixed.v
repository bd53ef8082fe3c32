// The same ring, fed with a one only when its first 63 stages are empty: at most 63 clocks until one alone is left.
// The output is the first stage, and a one that is fed in has that low for 63 clocks to come whatever else goes round:
// the wave is right from the first half-cycle on.
// check: --ratio 64 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2, obligation
module ring_64_onehot_fixed (input clk, input rst, output slow);
  reg [63:0] ring;
  always @(posedge clk)
    if (rst) ring <= 64'd1;
    else ring <= {ring[62:0], ~|ring[62:0]};
  assign slow = ring[0];
endmodule
