// One second from a 50 MHz oscillator at 50 %: a counter that goes down and is loaded again, and a toggle.
// compare: pairs/second_up.v --old-set FROM=24999999
// verdict: proved
module second_down #(parameter FROM = 24999999) (input clk, input rst, output reg second);
  reg [24:0] left;
  always @(posedge clk)
    if (rst) begin
      left <= FROM;
      second <= 1'b0;
    end else if (left == 25'd0) begin
      left <= FROM;
      second <= ~second;
    end else left <= left - 25'd1;
endmodule
