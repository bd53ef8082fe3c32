// Modified shift registers with all 2^n states on one loop (a NOR of all stages but the last, XOR-ed in):
// no state sticks. Periods 16, 32, 256 and 1024 are published for 4, 5, 8 and 10 stages.
// The decode of zero pulses as the single one moves on: the old place falls before the new one rises.
// check: --set STAGES=4 --set TAPS=12 --ratio 16 --high 2 --waive 'glitch-free=the mark is an enable'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
// check: --set STAGES=5 --set TAPS=20 --ratio 32 --high 2 --waive 'glitch-free=the mark is an enable'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
// check: --set STAGES=8 --set TAPS=184 --ratio 256 --high 2 --waive 'glitch-free=the mark is an enable'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
// check: --set STAGES=10 --set TAPS=576 --ratio 1024 --high 2 --waive 'glitch-free=the mark is an enable'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
module shift_full #(parameter STAGES = 4, parameter TAPS = 12) (input clk, output mark);
  reg [STAGES-1:0] stage;
  wire empty = ~|stage[STAGES-2:0];
  always @(posedge clk) stage <= {stage[STAGES-2:0], (^(stage & TAPS)) ^ empty};
  assign mark = stage == 0;
endmodule
