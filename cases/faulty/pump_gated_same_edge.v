// Clock of the sampling pump by 6, gated by the enable from a flip-flop on the clock's own edge, which may change in
// the middle of a pulse.
// check: --ratio 6 --moving run
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 2
// enable: refuted, run 8
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module pump_gated_same_edge (input wire clk, rst, run, output wire pump);
  reg [1:0] count;
  reg half, held;
  always @(posedge clk)
    if (rst) {half, held, count} <= 4'd0;
    else begin
      held <= run;
      if (count == 2'd2) {half, count} <= {~half, 2'd0};
      else count <= count + 2'd1;
    end
  assign pump = half & held;
endmodule
