// Bit clock of the logger's modem: 14 745 600 ticks from 50 MHz by a 32-bit accumulator that adds 1 266 637 395 each
// cycle. By the general law the carry comes that many times in 2^32 cycles, 3 or 4 cycles apart; at power-up it may
// be 1 where the sum does not want it, for one input cycle.
// check: --ratio 4294967296/1266637395 --mean --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// glitch-free: proved
// reset: proved, held 2
module modem_accumulator (input clk, input rst, output reg bit_clk);
  reg [31:0] sum;
  always @(posedge clk)
    if (rst) {bit_clk, sum} <= 33'd0;
    else {bit_clk, sum} <= {1'b0, sum} + 33'd1266637395;
endmodule
