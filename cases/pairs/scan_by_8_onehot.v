// The scan clock by 8 from a ring of which one bit is set.
// compare: pairs/scan_by_8_twisted.v
// verdict: proved
module scan_by_8_onehot (input clk, input rst, output scan);
  reg [7:0] ring;
  always @(posedge clk)
    if (rst) ring <= 8'b00000001;
    else ring <= {ring[6:0], ring[7]};
  assign scan = |ring[7:4];
endmodule
