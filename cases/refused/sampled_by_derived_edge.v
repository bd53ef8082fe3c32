// A stage that is clocked by the carry of the count and samples that carry.
// check: --ratio 4
// error: late samples carry clocks it simulator new value gates race
// line: 14
module sampled_by_derived_edge (input clk, output tick);
  reg [1:0] count;
  reg late, carry;
  wire last = !carry;
  always @(posedge clk) begin
    count <= count + 2'd1;
    carry <= &count;
  end
  always @(negedge last)
    late <= carry & ~late;
  assign tick = late;
endmodule
