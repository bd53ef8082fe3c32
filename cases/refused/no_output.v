// A divider that drives nothing out.
// check: --ratio 4
// error: output
// line: 5
module no_output (input clk);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
endmodule
