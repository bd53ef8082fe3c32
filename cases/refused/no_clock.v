// Nothing in this module stores anything.
// check: --ratio 4
// error: clock
// line: 5
module no_clock (input float_high, input float_low, output level);
  assign level = float_high & ~float_low;
endmodule
