// Pump pulses, one clock pulse in four: the count's last value opens a latch's data while the clock is high, the latch
// passes it on while the clock is low, and the gate sees an enable that is at rest whenever the clock is high. The
// clock has to close the gate before the latch that it opens changes the enable.
// check: --ratio 4 --high 1
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 1, exact
// settling: proved
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
// note: 19: open is a latch
module pump_by_4_gated (input clk, output pulses);
  reg [1:0] count;
  reg open;
  always @(posedge clk) count <= count + 2'd1;
  always @* if (!clk) open = count == 2'd3;
  and gate (pulses, clk, open);
endmodule
