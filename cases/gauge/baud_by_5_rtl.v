// The baud clock by 5 at 50 % as plain RTL without any reset: illegal counts go home in one input cycle.
// check: --ratio 5 --output baud
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 5 --high 2 --output top
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 5 --high 4 --output middle
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
module baud_by_5_rtl (input wire clk, output wire baud, top, middle);
  reg [2:0] count;
  reg late;
  always @(posedge clk)
    if (count < 4) count <= count + 1;
    else count <= 0;
  always @(negedge clk)
    late <= middle;
  assign {top, middle} = count[2:1];
  assign baud = top | late;
endmodule
