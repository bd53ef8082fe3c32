// The reset rises by the list and is tested low.
// check: --ratio 4
// error: posedge rst_n simulator sample data gates reset negedge
// line: 7
module reset_edge_and_test_low (input clk, input rst_n, output tick);
  reg [1:0] count;
  always @(posedge clk or posedge rst_n)
    if (!rst_n) count <= 2'd0;
    else count <= count + 2'd1;
  assign tick = count[1];
endmodule
