// Dither clock of the ultrasonic receiver: a 32-bit linear shift register of maximal length (taps 32, 22, 2, 1), with
// one state decoded. All but the lock-up state are on one loop of 2^32 - 1.
// The decode pulses where bit 30 falls before bit 0 rises.
// check: --ratio 4294967295 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// from reset: period 8589934590, high 2
module noise_32_lfsr (input clk, input rst, output pulse);
  reg [31:0] q;
  always @(posedge clk)
    if (rst) q <= 32'd1;
    else q <= {q[30:0], q[31] ^ q[21] ^ q[1] ^ q[0]};
  assign pulse = q == 32'h8000_0000;
endmodule
