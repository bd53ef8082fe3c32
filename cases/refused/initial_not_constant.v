// An initial value that depends on an input.
// check: --ratio 4 --hold start=1
// error: initial
// line: 6
module initial_not_constant (input clk, input start, output reg tick);
  initial tick = start;
  always @(posedge clk) tick <= ~tick;
endmodule
