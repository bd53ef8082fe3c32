// The sampling clock counted up to the divisor as it is at each edge.
// compare: pairs/sample_down.v
// verdict: proved
// compare: pairs/sample_down.v --moving divisor
// verdict: refuted
// differs: 1
module sample_live #(parameter W = 4) (input clk, input rst, input [W-1:0] divisor, output reg sample);
  reg [W-1:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      sample <= 1'b0;
    end else if (count == divisor) begin
      count <= 0;
      sample <= ~sample;
    end else count <= count + 1;
endmodule
