// A heater clock by 6 that the reset line itself blanks. When it goes the blanked high time comes through at once, in the
// middle of a half-cycle, and the falling edge follows after the third rising edge: 4.5 half-cycles where the clock was low
// at the release, 5.5 where it was high, and 6 were to be.
// Its decode pulses too, from 1 to 2 by way of 3.
// check: --ratio 6
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// reset: refuted, held 0
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module gated_by_reset (input clk, input rst_n, output heater);
  reg [2:0] count;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) count <= 3'd0;
    else count <= count >= 3'd5 ? 3'd0 : count + 3'd1;
  assign heater = rst_n & (count < 3'd3);
endmodule
