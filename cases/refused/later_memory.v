// A memory, not read yet.
// check: --ratio 4
// error: pattern
// line: 6
module later_memory (input clk, output tick);
  reg pattern [0:3];
  reg [1:0] count;
  initial begin
    pattern[0] = 1'b0;
    pattern[1] = 1'b0;
    pattern[2] = 1'b1;
    pattern[3] = 1'b1;
  end
  always @(posedge clk) count <= count + 2'd1;
  assign tick = pattern[count];
endmodule
