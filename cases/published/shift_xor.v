// Linear feedback shift registers of the published tap table (3 to 10 stages; stage i is bit i - 1, the new
// bit is the XOR of the taps and enters stage 1): 2^n - 1 states on one loop, and all zeros stuck. The
// output decodes one state.
// The decode of ones pulses as a single zero on a tap moves on: the old place rises before the new one falls.
// check: --set STAGES=3 --set TAPS=6 --ratio 7 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 14, high 2
// loops: 2
// false loops: 1
// stuck: yes
// check: --set STAGES=4 --set TAPS=12 --ratio 15 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 30, high 2
// loops: 2
// false loops: 1
// stuck: yes
// check: --set STAGES=5 --set TAPS=20 --ratio 31 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 62, high 2
// loops: 2
// false loops: 1
// stuck: yes
// check: --set STAGES=6 --set TAPS=48 --ratio 63 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 126, high 2
// loops: 2
// false loops: 1
// stuck: yes
// check: --set STAGES=7 --set TAPS=96 --ratio 127 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 254, high 2
// loops: 2
// false loops: 1
// stuck: yes
// check: --set STAGES=8 --set TAPS=184 --ratio 255 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 510, high 2
// loops: 2
// false loops: 1
// stuck: yes
// check: --set STAGES=9 --set TAPS=272 --ratio 511 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 1022, high 2
// loops: 2
// false loops: 1
// stuck: yes
// check: --set STAGES=10 --set TAPS=576 --ratio 1023 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// from initial: period 2046, high 2
// loops: 2
// false loops: 1
// stuck: yes
module shift_xor #(parameter STAGES = 4, parameter TAPS = 12) (input clk, output mark);
  reg [STAGES-1:0] stage = 1;
  always @(posedge clk) stage <= {stage[STAGES-2:0], ^(stage & TAPS)};
  assign mark = &stage;
endmodule
