// The count is assigned with = and with <=: what is read in between depends on the simulator.
// check: --ratio 4
// error: count both = and <=
// line: 9
module blocking_and_nonblocking (input clk, input rst, output tick);
  reg [1:0] count;
  always @(posedge clk)
    if (rst) count = 2'd0;
    else count <= count + 2'd1;
  assign tick = count[1];
endmodule
