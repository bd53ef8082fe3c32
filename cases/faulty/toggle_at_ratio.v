// A toggle at the full ratio instead of half of it: asked for 6, divides by 12.
// check: --ratio 6
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: period 24, high 12
// loops: 1
// false loops: 1
module toggle_at_ratio #(parameter RATIO = 6) (input clk, input rst_n, output reg slow);
  reg [3:0] count;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) {slow, count} <= 5'd0;
    else if (count >= RATIO - 1) {slow, count} <= {~slow, 4'd0};
    else count <= count + 4'd1;
endmodule
