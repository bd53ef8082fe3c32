// Clock of the sampling pump by 50 000 000, gated by an enable: by way of a latch that is open while the ungated clock
// is low (SAFE = 1), or as it comes. A count that powers up just past its wrap takes 2^26 − 25 000 000 input cycles,
// 84 217 728 half-cycles, to run round its register; a latch that powers up closed adds the high half. Gated as it
// comes, the output is chopped in the half-cycle in which it rises.
// check: --ratio 50_000_000 --moving run
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 134217728, exact
// settling: proved
// reset: proved
// enable: proved, back 134217728, parked 0
// from reset: period 100000000, high 50000000
// check: --set SAFE=0 --ratio 50_000_000 --moving run
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 84217728, exact
// settling: proved
// reset: proved
// enable: refuted, run 2
// from reset: period 100000000, high 50000000
module pump_gated_25m #(parameter SAFE = 1) (input wire clk, rst, run, output wire pump);
  reg [25:0] count;
  reg half;
  always @(posedge clk)
    if (rst) {half, count} <= 27'd0;
    else if (count == 26'd24_999_999) {half, count} <= {~half, 26'd0};
    else count <= count + 26'd1;
  generate
    if (SAFE) begin : gated
      reg held;
      always @* if (!half) held = run;
      assign pump = half & held;
    end else assign pump = half & run;
  endgenerate
endmodule
