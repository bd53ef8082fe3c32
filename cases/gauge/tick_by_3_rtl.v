// The sampling tick by 3 at 50 % as plain RTL: a counter on the rising edge, its top bit again on the
// falling edge, and their OR. Asynchronous reset, active high.
// check: --ratio 3 --output tick
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// from reset: period 6, high 3
// loops: 1
// false loops: 0
// check: --ratio 3 --high 2 --output third
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 6, high 2
// loops: 1
// false loops: 0
// check: --ratio 3 --output tick --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
module tick_by_3_rtl (input clk, input rst, output tick, output third);
  reg [1:0] count;
  reg late;
  always @(posedge clk or posedge rst)
    if (rst) count <= 2'd0;
    else if (count >= 2'd2) count <= 2'd0;
    else count <= count + 2'd1;
  always @(negedge clk or posedge rst)
    if (rst) late <= 1'b0;
    else late <= count[1];
  assign third = count[1];
  assign tick = third | late;
endmodule
