// Radio clock by 4·b + a that swallows an extra cycle in a of b rounds, claimed for every pair of values: where a is
// greater than b there are not rounds enough to swallow in, and by 2 and 3 it divides by 10 instead of 11.
// check: --each b=2..9 --each a --ratio 4*b+a --high '10 if a > 0 else 8'
// verdict: refuted
// ratio: refuted
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 2
// at: b=2, a=3
// from reset: period 20, high 10
// loops: 1
// false loops: 1
module radio_swallow_short (input clk, input rst, input [3:0] b, input [2:0] a, output reg radio);
  reg [2:0] pre;
  reg [3:0] rounds;
  reg [2:0] swallow;
  wire more = swallow != 3'd0;
  wire last = pre == (more ? 3'd4 : 3'd3);
  always @(posedge clk)
    if (rst) begin
      pre <= 3'd0;
      rounds <= 4'd0;
      swallow <= 3'd0;
      radio <= 1'b0;
    end else if (!last) pre <= pre + 3'd1;
    else begin
      pre <= 3'd0;
      radio <= rounds == 4'd0;
      if (rounds == 4'd0) begin
        rounds <= b - 4'd1;
        swallow <= a;
      end else begin
        rounds <= rounds - 4'd1;
        if (more) swallow <= swallow - 3'd1;
      end
    end
endmodule
