// The pinger's clock by 7 at 50 % as plain RTL with a synchronous active-low reset; the half-cycle flip-
// flop follows the counter and needs no reset.
// check: --ratio 7 --output ping
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 3
// from reset: period 14, high 7
// loops: 1
// false loops: 0
// check: --ratio 7 --high 6 --output top
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// from reset: period 14, high 6
// loops: 1
// false loops: 0
// check: --ratio 7 --output ping --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 3
// loops: 1
// false loops: 0
module ping_by_7_rtl (input clk, input srst_n, output ping, output top);
  reg [2:0] count;
  reg late;
  always @(posedge clk)
    if (srst_n == 1'b0) count <= 3'b000;
    else if (count == 3'd6) count <= 3'b000;
    else count <= count + 3'b001;
  always @(negedge clk) late <= count[2];
  assign top = count[2];
  assign ping = late || top;
endmodule
