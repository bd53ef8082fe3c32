// The by-5 of two toggles and an XOR with both toggles on the rising edge: the high time depends on which
// came first, 4 or 6 of 10 half-cycles, never 5.
// check: --ratio 5
// verdict: refuted
// ratio: proved
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 2
// false loops: 2
module wrong_edge_toggle (input clk, output slow);
  reg [2:0] count;
  reg one_side, other_side;
  always @(posedge clk) begin
    count <= (count >= 3'd4) ? 3'd0 : count + 3'd1;
    if (count == 3'd0) one_side <= ~one_side;
    if (count == 3'd3) other_side <= ~other_side;
  end
  assign slow = one_side ^ other_side;
endmodule
