// The same in 24 bits with xnor feedback (taps 24, 23, 22, 17), single flip-flops: its lock-up state is all ones.
// The decode of zero pulses as a single one moves on: the old place falls before the new one rises.
// check: --ratio 16777215 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: proved, held 0
module noise_24_xnor (input clk, input rst_n, output pulse);
  reg [24:1] q;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) q <= 24'd0;
    else q <= {q[23:1], ~(q[24] ^ q[23] ^ q[22] ^ q[17])};
  assign pulse = ~|q;
endmodule
