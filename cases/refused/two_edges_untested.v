// Two edges in one list and no test that says which of them is a reset.
// check: --ratio 4 --clock clk
// error: edges both no flip-flop has two clocks
// line: 6
module two_edges_untested (input clk, input strobe, output reg tick);
  always @(posedge clk or posedge strobe)
    tick <= ~tick;
endmodule
