// A stage that contains itself.
// check: --ratio 4 --module module_in_itself
// error: module_in_itself
// line: 8
module module_in_itself (input clk, output tick);
  reg half;
  always @(posedge clk) half <= ~half;
  module_in_itself again (.clk(half), .tick(tick));
endmodule
