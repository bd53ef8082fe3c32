// Four-bit counter of the published '163 kind that loads P on its carry: modulus 16 - P (from memory).
// The carry is decoded, with pulses on the way: from 7 to 8 (or 13 to 14) bits rise before others fall. With
// P = 14 one bit changes at a time.
// check: --hold p=0 --ratio 16 --high 2 --waive 'glitch-free=the carry enables the next part and clocks nothing'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// from reset: period 32, high 2
// loops: 1
// false loops: 0
// check: --hold p=3 --ratio 13 --high 2 --waive 'glitch-free=the carry enables the next part and clocks nothing'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// from reset: period 26, high 2
// loops: 1
// false loops: 0
// check: --hold p=6 --ratio 10 --high 2 --waive 'glitch-free=the carry enables the next part and clocks nothing'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 12, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// from reset: period 20, high 2
// loops: 1
// false loops: 0
// check: --hold p=10 --ratio 6 --high 2 --waive 'glitch-free=the carry enables the next part and clocks nothing'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 20, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// from reset: period 12, high 2
// loops: 1
// false loops: 0
// check: --hold p=14 --ratio 2 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 28, exact
// settling: proved
// reset: proved, held 2
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --each p=0..14 --ratio 16-p --high 2 --waive 'glitch-free=the carry enables the next part and clocks nothing'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 28, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// at: p=0
// from reset: period 32, high 2
// loops: 1
// false loops: 0
module preset_modulus (input clk, input clear_n, input [3:0] p, output carry);
  reg [3:0] count;
  assign carry = &count;
  always @(posedge clk)
    if (!clear_n) count <= 4'b0;
    else if (carry) count <= p;
    else count <= count + 1'b1;
endmodule
