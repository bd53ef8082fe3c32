// The list names an edge of the clock and the level of the reset.
// check: --ratio 4
// error: edges and levels simulator gates posedge
// line: 7
module edge_and_level (input clk, input rst, output tick);
  reg [1:0] count;
  always @(posedge clk or rst)
    if (rst) count <= 2'd0;
    else count <= count + 2'd1;
  assign tick = count[1];
endmodule
