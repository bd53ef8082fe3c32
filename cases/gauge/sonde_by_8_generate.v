// Sonde clock by 8, 4 or 2: a chain of toggle stages made by a generate loop, each on the falling edge of
// the one before, with an asynchronous clear.
// check: --ratio 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 16, high 8
// loops: 1
// false loops: 0
// check: --set STAGES=2 --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 8, high 4
// loops: 1
// false loops: 0
// check: --set STAGES=1 --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module sonde_by_8_generate #(parameter STAGES = 3) (input clk, input clear_n, output sonde);
  wire [STAGES:0] chain;
  assign chain[0] = clk;
  genvar i;
  generate
    for (i = 0; i < STAGES; i = i + 1) begin : stage
      reg q;
      always @(negedge chain[i] or negedge clear_n)
        if (!clear_n) q <= 1'b0;
        else q <= ~q;
      assign chain[i + 1] = q;
    end
  endgenerate
  assign sonde = chain[STAGES];
endmodule
