// A flip-flop that samples the clock with the clock's own edge.
// check: --ratio 4
// error: sampled by the edge it makes simulator new value gates race
// line: 9
module sampled_by_its_edge (input clk, output tick);
  reg [1:0] count;
  reg level;
  always @(negedge clk) count <= count + 2'd1;
  always @(posedge clk)
    level <= clk ^ count[1];
  assign tick = level;
endmodule
