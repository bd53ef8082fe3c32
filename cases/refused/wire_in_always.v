// A net assigned in an always block.
// check: --ratio 4
// error: tick
// line: 6
module wire_in_always (input clk, output tick);
  always @(posedge clk) tick <= ~tick;
endmodule
