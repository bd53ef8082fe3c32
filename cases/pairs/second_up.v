// One second from a 50 MHz oscillator at 50 %: a counter that goes up and wraps, and a toggle. The same counted down,
// and counted down from one too few: the first edge then comes an input cycle early, after 25 million of them.
// compare: pairs/second_down.v
// verdict: proved
// compare: pairs/second_down.v --new-set FROM=24999998
// verdict: refuted
// differs: 49999997
// compare: pairs/second_down.v --after any --lag any
// verdict: proved
// settled: 17108864
module second_up (input clk, input rst, output reg second);
  reg [24:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 25'd0;
      second <= 1'b0;
    end else if (count == 25'd24999999) begin
      count <= 25'd0;
      second <= ~second;
    end else count <= count + 25'd1;
endmodule
