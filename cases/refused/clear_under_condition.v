// The reset clears only while the pump is quiet.
// check: --ratio 4
// error: count further condition simulator edges gates
// line: 7
module clear_under_condition (input clk, input rst, input quiet, output tick);
  reg [1:0] count;
  always @(posedge clk or posedge rst)
    if (rst) begin
      if (quiet) count <= 2'd0;
    end else
      count <= count + 2'd1;
  assign tick = count[1];
endmodule
