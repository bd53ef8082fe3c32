// Radio clock of the gauge: a prescaler by 4 or 5 whose extra cycle is swallowed a times in b of its rounds, so it
// divides by 4·b + a, provided that b is at least a (references: dual-modulus dividers, N = P·B + A with B >= A). The
// output is high for the first round, which is a long one unless a is 0.
// check: --each b=2..9 --each a --where 'b >= a' --ratio 4*b+a --high '10 if a > 0 else 8'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 140, exact
// settling: proved
// reset: proved, held 2
// at: b=2, a=0
// from reset: period 16, high 8
// loops: 1
// false loops: 0
module radio_swallow (input clk, input rst, input [3:0] b, input [2:0] a, output reg radio);
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
