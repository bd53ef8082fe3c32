// The scan clock by 8 from a twisted ring, reset at once instead of at an edge; low active.
// compare: pairs/scan_by_8_gray.v
// verdict: proved
module scan_by_8_twisted (input clk, input rst_n, output scan);
  reg [3:0] ring;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) ring <= 4'b0000;
    else ring <= {ring[2:0], ~ring[3]};
  assign scan = ring[3];
endmodule
