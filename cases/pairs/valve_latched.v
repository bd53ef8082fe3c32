// Valve clock by 2 behind an enable: the gate opens and closes by a latch that is transparent while the clock is low.
// An enable taken at the falling edge, or as it is, gates alike only while it stands still: moved while the clock is
// low it reaches the latch and not the flip-flop, and moved while the clock is high it passes the bare gate at once, in
// the middle of a half-cycle.
// compare: pairs/valve_falling.v
// verdict: proved
// compare: pairs/valve_falling.v --moving enable
// verdict: refuted
// differs: 1
// compare: pairs/valve_bare.v
// verdict: proved
// compare: pairs/valve_bare.v --moving enable
// verdict: refuted
// differs: 1
// compare: pairs/valve_gates.v --moving enable
// verdict: proved
module valve_latched (input clk, input rst, input enable, output valve);
  reg half, open;
  always @(posedge clk)
    if (rst) half <= 1'b0;
    else half <= ~half;
  always @* if (!clk) open = enable;
  assign valve = clk & open & half;
endmodule
