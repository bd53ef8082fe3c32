// The toggle divider's output passes a gate that inverts its own output while the count is even, so the
// gate never settles.
// check: --ratio 4
// verdict: refuted
// settling: refuted
// note: 13: combinational loop: chase -> chase
module gate_that_chases_itself (input clk, input rst, output slow);
  reg [1:0] count;
  wire chase;
  always @(posedge clk or posedge rst)
    if (rst) count <= 2'd0;
    else count <= count + 2'd1;
  assign chase = count[0] ? 1'b0 : ~chase;
  assign slow = count[1] ^ chase;
endmodule
