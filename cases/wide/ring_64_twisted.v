// A twisted ring of 64 stages without correction: right from reset, and full of false loops.
// check: --ratio 128
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: refuted
// settling: proved
// reset: proved, held 2
module ring_64_twisted (input clk, input rst, output slow);
  reg [63:0] ring;
  always @(posedge clk)
    if (rst) ring <= 64'd0;
    else ring <= {ring[62:0], ~ring[63]};
  assign slow = ring[0];
endmodule
