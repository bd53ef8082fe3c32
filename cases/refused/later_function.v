// A function, not read yet.
// check: --ratio 4
// error: function
// line: 6
module later_function (input clk, output tick);
  function [1:0] advance;
    input [1:0] value;
    advance = value + 2'd1;
  endfunction
  reg [1:0] count;
  always @(posedge clk) count <= advance(count);
  assign tick = count[1];
endmodule
