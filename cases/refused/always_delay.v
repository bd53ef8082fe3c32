// A clock made by delays, which is a bench and no divider.
// check: --ratio 4
// error: always
// line: 7
module always_delay (input clk, output reg tick);
  reg spin;
  always #5 spin = ~spin;
  always @(posedge clk) tick <= spin;
endmodule
