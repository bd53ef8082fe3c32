// Two toggles a half-cycle grid apart, one on each edge, and their XOR: by 5 at 50 %, where only one input
// of the XOR moves at a time. Either phase of either toggle gives the same wave.
// check: --ratio 5
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 2
// false loops: 0
module odd_by_5_quadrature (input clk, output slow);
  reg [2:0] count;
  reg rise_side, fall_side;
  always @(posedge clk) begin
    count <= (count >= 3'd4) ? 3'd0 : count + 3'd1;
    if (count == 3'd0) rise_side <= ~rise_side;
  end
  always @(negedge clk)
    if (count == 3'd3) fall_side <= ~fall_side;
  xor merge (slow, rise_side, fall_side);
endmodule
