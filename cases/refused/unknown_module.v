// The level filter is instantiated and nowhere defined.
// check: --ratio 4
// error: level_filter
// line: 8
module unknown_module (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  level_filter filter (.in(count[1]), .out(tick));
endmodule
