// Clock of the sampling pump by 6, gated: the enable passes a latch that is open while the ungated clock is low, so
// that it can't change while that is high.
// check: --ratio 6 --moving run
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// reset: proved, held 2
// enable: proved, back 6, exact, parked 0
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module pump_gated_latch (input wire clk, rst, run, output wire pump);
  reg [1:0] count;
  reg half, held;
  always @(posedge clk)
    if (rst) {half, count} <= 3'd0;
    else if (count == 2'd2) {half, count} <= {~half, 2'd0};
    else count <= count + 2'd1;
  always @* if (!half) held = run;
  assign pump = half & held;
endmodule
