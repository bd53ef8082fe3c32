// A combinational block that is not told of one of its inputs.
// check: --ratio 4
// error: invert sensitivity list simulator gates
// line: 9
module incomplete_list (input clk, output reg tick);
  reg [1:0] count;
  reg invert;
  always @(posedge clk) {invert, count} <= {invert, count} + 3'd1;
  always @(count) tick = count[1] ^ invert;
endmodule
