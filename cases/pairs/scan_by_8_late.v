// The scan clock by 8 resampled on the falling edge, half a cycle late.
// compare: pairs/scan_by_8_binary.v --lag -1
// verdict: proved
// lag: -1
module scan_by_8_late (input clk, input rst, output reg scan);
  reg [2:0] count;
  always @(posedge clk)
    if (rst) count <= 3'd0;
    else count <= count + 3'd1;
  always @(negedge clk) scan <= count[2];
endmodule
