// Clock of the sampling pump by 6, counted on a clock that a flip-flop of the clock's own rising edge gates: the counter
// may count once more, or not, at the edge that stops it.
// check: --ratio 6 --moving run
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// glitch-free: proved
// reset: proved, held 0
// enable: refuted, run 4
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module pump_counts_gated (input wire clk, rst, run, output reg pump);
  reg held;
  reg [1:0] count;
  wire gated = clk & held;
  always @(posedge clk or posedge rst)
    if (rst) held <= 1'b0;
    else held <= run;
  always @(posedge gated or posedge rst)
    if (rst) {pump, count} <= 3'd0;
    else if (count == 2'd2) {pump, count} <= {~pump, 2'd0};
    else count <= count + 2'd1;
endmodule
