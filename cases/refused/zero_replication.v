// A replication of nothing.
// check: --ratio 4
// error: replication
// line: 8
module zero_replication #(parameter PAD = 0) (input clk, output tick);
  reg [1:0] count;
  always @(posedge clk) count <= count + 2'd1;
  assign tick = |{PAD{count[1]}};
endmodule
