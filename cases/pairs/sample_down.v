// The sampling clock counted down from the divisor.
// compare: pairs/sample_up.v --moving divisor
// verdict: proved
module sample_down #(parameter W = 4) (input clk, input rst, input [W-1:0] divisor, output reg sample);
  reg [W-1:0] left;
  always @(posedge clk)
    if (rst) begin
      left <= divisor;
      sample <= 1'b0;
    end else if (left == 0) begin
      left <= divisor;
      sample <= ~sample;
    end else left <= left - 1;
endmodule
