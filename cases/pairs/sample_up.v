// Sampling clock with a divisor that may be written at any time: the count goes up to a copy of it that is taken at
// each wrap. The same counted down; and counted up to the divisor as it is, which is the same only while that stands
// still. That one misses its limit where a smaller divisor is written behind it.
// compare: pairs/sample_down.v
// verdict: proved
// compare: pairs/sample_down.v --moving divisor
// verdict: proved
// compare: pairs/sample_down.v --set W=24 --moving divisor
// verdict: proved
// compare: pairs/sample_live.v
// verdict: proved
// compare: pairs/sample_live.v --moving divisor
// verdict: refuted
// differs: 1
// compare: pairs/sample_live.v --set W=24 --map divisor=divisor
// verdict: proved
module sample_up #(parameter W = 4) (input clk, input rst, input [W-1:0] divisor, output reg sample);
  reg [W-1:0] count, last;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      last <= divisor;
      sample <= 1'b0;
    end else if (count == last) begin
      count <= 0;
      last <= divisor;
      sample <= ~sample;
    end else count <= count + 1;
endmodule
