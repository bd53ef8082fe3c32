// The latched valve clock as gates: the latch is an AND-OR multiplexer that feeds itself. Without its third AND gate
// what it holds is lost while the clock rises, between the gate that lets go and the one that takes over.
// compare: pairs/valve_latched.v --moving enable
// verdict: proved
// compare: pairs/valve_latched.v --old-define BARE= --moving enable
// verdict: refuted
// differs: 1
// compare: pairs/valve_latched.v --old-define BARE=
// verdict: refuted
// differs: 1
module valve_gates (input clk, input rst, input enable, output valve);
  wire clk_n, through, kept, held, open;
  reg half;
  not turn (clk_n, clk);
  and pass (through, clk_n, enable);
  and keep (kept, clk, open);
`ifdef BARE
  or latch (open, through, kept);
`else
  and bridge (held, enable, open);
  or latch (open, through, kept, held);
`endif
  always @(posedge clk) half <= ~half & ~rst;
  and gate (valve, clk, open, half);
endmodule
