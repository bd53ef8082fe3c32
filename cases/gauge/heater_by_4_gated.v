// Heater clock of the intake: every second pulse of the oscillator passes a gate, opened while the clock is
// low, and toggles a flip-flop.
// The pulses are whole only if the clock reaches the gate before the enable that the same falling edge launches.
// check: --ratio 4 --output heater
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 2 --high 1 --output pulses
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
module heater_by_4_gated (input clk, output reg heater, output pulses);
  reg open;
  always @(negedge clk) open <= ~open;
  assign pulses = clk & open;
  always @(posedge pulses) heater <= ~heater;
endmodule
