// Clock of the sampling pump by 6, gated by the bare enable: a move while the ungated clock is high makes a pulse as
// short as you like.
// check: --ratio 6 --moving run
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 2
// enable: refuted, run 6
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module pump_gated_bare (input wire clk, rst, run, output wire pump);
  reg [1:0] count;
  reg half;
  always @(posedge clk)
    if (rst) {half, count} <= 3'd0;
    else if (count == 2'd2) {half, count} <= {~half, 2'd0};
    else count <= count + 2'd1;
  assign pump = half & run;
endmodule
