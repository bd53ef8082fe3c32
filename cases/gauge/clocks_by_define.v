// Rates kept in an included file and picked by macro; old-style ports; a casez decode of the count.
// check: --ratio 12
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// reset: proved, held 2
// from reset: period 24, high 12
// loops: 1
// false loops: 0
// check: --define FAST=1 --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 14, exact
// settling: proved
// reset: proved, held 2
// from reset: period 8, high 4
// loops: 1
// false loops: 0
`include "rates.vh"

module clocks_by_define (clk, rst, slow);
  input clk, rst;
  output slow;
  reg [3:0] count;
  reg slow;
`ifdef FAST
  localparam [3:0] LAST = `HALF(`FAST_RATE) - 1;
`else
  localparam [3:0] LAST = `HALF(`SLOW_RATE) - 1;
`endif
  wire [3:0] over = count - LAST;
  always @(posedge clk)
    casez ({rst, |over, over[3]})
      3'b1??: begin count <= 4'd0; slow <= 1'b0; end
      3'b00?: begin count <= 4'd0; slow <= ~slow; end
      3'b011: count <= count + 4'd1;
      default: count <= 4'd0;
    endcase
endmodule
