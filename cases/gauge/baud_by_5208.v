// 9600 baud from 50 MHz, as near as a whole ratio comes: 5208 by a count of 2604 and a toggle, compare
// exact, no reset. The worst illegal count needs 2984 half-cycles.
// check: --ratio 5208
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2984, exact
// settling: proved
// loops: 1
// false loops: 0
module baud_by_5208 #(parameter RATIO = 5208) (input clk, output reg baud);
  localparam WIDTH = $clog2(RATIO / 2);
  localparam [WIDTH-1:0] LAST = RATIO / 2 - 1;
  reg [WIDTH-1:0] count;
  wire last = count == LAST;
  always @(posedge clk) count <= last ? {WIDTH{1'b0}} : count + 1'b1;
  always @(posedge clk) baud <= baud ^ last;
endmodule
