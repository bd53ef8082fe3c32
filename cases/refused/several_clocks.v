// Two inputs clock registers, and neither is named as the clock.
// check: --ratio 4 --output tick
// error: clock gauge_clk modem_clk
// line: 5
module several_clocks (input gauge_clk, input modem_clk, output reg tick);
  reg half;
  always @(posedge gauge_clk) half <= ~half;
  always @(posedge modem_clk) tick <= tick ^ half;
endmodule
