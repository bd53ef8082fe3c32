// Twenty-four toggle stages in a ripple: divides by 2^24, from any state.
// check: --ratio 16777216
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
module toggle (input ck, output reg q);
  always @(negedge ck) q <= ~q;
endmodule

module ripple_24 (input clk, output slow);
  wire [24:0] q;
  assign q[0] = clk;
  genvar i;
  generate
    for (i = 0; i < 24; i = i + 1) begin : stage
      toggle t (.ck(q[i]), .q(q[i + 1]));
    end
  endgenerate
  assign slow = q[24];
endmodule
