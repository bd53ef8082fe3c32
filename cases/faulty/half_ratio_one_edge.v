// A carrier asked for at 2.5 whose second pulse sits on the rising edge as well: gaps of 4 and 6 half-
// cycles in turn, so the high time is right and the ratio isn't.
// From 3 to 4 the decode passes by 0 or by 2.
// check: --ratio 2.5 --high 2
// verdict: refuted
// ratio: refuted
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: refuted, held 2
// from reset: period 10
// loops: 1
// false loops: 1
module half_ratio_one_edge (input clk, input rst, output carrier);
  reg [2:0] count;
  always @(posedge clk)
    if (rst) count <= 3'd0;
    else count <= (count >= 3'd4) ? 3'd0 : count + 3'd1;
  assign carrier = count == 3'd0 || count == 3'd2;
endmodule
