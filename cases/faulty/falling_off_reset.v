// The tick by 3 at 50 % from two counters on opposite edges, of which the one on the falling edge has been left off the
// reset. Each is at 2 for two half-cycles. In step, or one behind, they overlap in one of these and the tick is high for
// 3; from the third value the tick comes apart into two pulses of 2, for ever, however long reset was held. A counter
// that powers up at 3 goes to 0.
// check: --ratio 3
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 2
// loops: 3
// false loops: 1
module falling_off_reset (input clk, input rst, output tick);
  reg [1:0] rising, falling;
  always @(posedge clk)
    if (rst) rising <= 2'd0;
    else rising <= rising[1] ? 2'd0 : rising + 2'd1;
  always @(negedge clk)
    falling <= falling[1] ? 2'd0 : falling + 2'd1;
  assign tick = rising[1] | falling[1];
endmodule
