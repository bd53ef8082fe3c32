// The override names a parameter that the stage does not have.
// check: --ratio 4
// error: DEPTH
// line: 12
module stage #(parameter WIDTH = 2) (input ck, output q);
  reg [WIDTH-1:0] count;
  always @(posedge ck) count <= count + 1'b1;
  assign q = count[WIDTH-1];
endmodule

module unknown_parameter (input clk, output tick);
  stage #(.DEPTH(3)) eighth (.ck(clk), .q(tick));
endmodule
