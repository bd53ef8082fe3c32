// Clock generator of the published 8284 figures: by 3 with a third high, and by 6 at 50 %.
// check: --ratio 3 --high 2 --output clk_third
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// from reset: period 6, high 2
// loops: 1
// false loops: 0
// check: --ratio 6 --output clk_sixth
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module third_and_sixth (input osc, input reset_n, output clk_third, output reg clk_sixth);
  reg [1:0] state;
  always @(posedge osc, negedge reset_n)
    if (!reset_n) begin
      state <= 2'b00;
      clk_sixth <= 1'b0;
    end else begin
      state <= {state[0], ~|state};
      if (state[1]) clk_sixth <= ~clk_sixth;
    end
  assign clk_third = state[1];
endmodule
