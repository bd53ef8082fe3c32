// Two modules that nothing instantiates, and neither is named.
// check: --ratio 4
// error: first_gauge second_gauge module
module first_gauge (input clk, output reg tick);
  always @(posedge clk) tick <= ~tick;
endmodule

module second_gauge (input clk, output reg tick);
  always @(negedge clk) tick <= ~tick;
endmodule
