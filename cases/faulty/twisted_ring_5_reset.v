// The five-stage twisted ring with a reset: right from reset, locked up for ever after an upset.
// check: --ratio 10
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: proved, held 0
// from reset: period 20, high 10
// loops: 4
// false loops: 3
// check: --ratio 10 --start any
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: proved, held 0
// loops: 4
// false loops: 3
module twisted_ring_5_reset (input clk, input clr_n, output valve);
  reg [1:5] q;
  always @(posedge clk or negedge clr_n)
    if (!clr_n) q <= 5'b0;
    else q <= {~q[5], q[1:4]};
  assign valve = q[1];
endmodule
