// A one-hot ring of 64 stages without correction: dead once it is all zeros.
// check: --ratio 64 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: refuted, held 2
module ring_64_onehot (input clk, input rst, output slow);
  reg [63:0] ring;
  always @(posedge clk)
    if (rst) ring <= 64'd1;
    else ring <= {ring[62:0], ring[63]};
  assign slow = ring[0];
endmodule
