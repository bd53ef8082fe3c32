// The reset falls by the list and is tested high: simulator and gates part ways.
// check: --ratio 4
// error: negedge rst simulator sample data gates reset posedge
// line: 7
module reset_edge_and_test (input clk, input rst, output tick);
  reg [1:0] count;
  always @(posedge clk or negedge rst)
    if (rst) count <= 2'd0;
    else count <= count + 2'd1;
  assign tick = count[1];
endmodule
