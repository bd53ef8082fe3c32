// An event control in the middle of a clocked block.
// check: --ratio 4
// error: event
// line: 8
module wait_inside (input clk, output reg tick);
  always @(posedge clk) begin
    tick <= 1'b1;
    @(posedge clk) tick <= 1'b0;
  end
endmodule
