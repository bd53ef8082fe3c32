// The same tap table with XNOR feedback, reset to zero: all ones is the state that sticks.
// The decode of zero pulses on the way from 0...010, which moves on to 0...0101.
// check: --set STAGES=4 --set TAPS=12 --ratio 15 --high 2
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: proved, held 0
// from reset: period 30, high 2
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
// reset: proved, held 0
// from reset: period 254, high 2
// loops: 2
// false loops: 1
// stuck: yes
module shift_xnor #(parameter STAGES = 4, parameter TAPS = 12) (input clk, input rst_n, output mark);
  reg [STAGES-1:0] stage;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) stage <= {STAGES{1'b0}};
    else stage <= {stage[STAGES-2:0], ~^(stage & TAPS)};
  assign mark = stage == 0;
endmodule
