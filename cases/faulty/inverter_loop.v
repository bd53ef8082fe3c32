// One inverter fed by itself, OR-ed into the tick.
// check: --ratio 2
// verdict: refuted
// settling: refuted
// note: 10: combinational loop: spin -> spin
module inverter_loop (input clk, output tick);
  reg half;
  wire spin;
  always @(posedge clk) half <= ~half;
  assign spin = ~spin;
  assign tick = half | spin;
endmodule
