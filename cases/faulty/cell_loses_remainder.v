// Accumulator for 16/3 that starts from 0 at every overflow instead of keeping the remainder: every gap is 6 input
// cycles, one of the two lengths that are allowed, so that only the mean is wrong.
// check: --ratio 16/3 --mean
// verdict: refuted
// ratio: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 2
// from reset: period 12, high 2
// loops: 1
// false loops: 1
module cell_loses_remainder (input clk, input rst, output reg cell_clk);
  reg [3:0] sum;
  wire [4:0] next = sum + 5'd3;
  always @(posedge clk)
    if (rst) begin
      sum <= 4'd0;
      cell_clk <= 1'b0;
    end else begin
      sum <= next[4] ? 4'd0 : next[3:0];
      cell_clk <= next[4];
    end
endmodule
