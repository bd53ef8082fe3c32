// A twelve-bit count by threes with an exact compare that it steps over twice: 1000 is met only on the
// third way round, after 3065 input cycles instead of the 334 meant.
// check: --ratio 668
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: period 12260, high 6130
// loops: 1
// false loops: 1
module oversteps_compare (input clk, input rst, output reg slow);
  reg [11:0] count;
  always @(posedge clk or posedge rst)
    if (rst) begin
      count <= 12'd0;
      slow <= 1'b0;
    end else if (count == 12'd1000) begin
      count <= 12'd0;
      slow <= ~slow;
    end else
      count <= count + 12'd3;
endmodule
