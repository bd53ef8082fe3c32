// The scan clock by 8 counted in Gray code.
// compare: pairs/scan_by_8_twisted.v
// verdict: proved
module scan_by_8_gray (input clk, input rst, output scan);
  reg [2:0] gray;
  wire [2:0] binary = {gray[2], gray[2] ^ gray[1], ^gray};
  wire [2:0] next = binary + 3'd1;
  always @(posedge clk)
    if (rst) gray <= 3'd0;
    else gray <= next ^ (next >> 1);
  assign scan = gray[2];
endmodule
