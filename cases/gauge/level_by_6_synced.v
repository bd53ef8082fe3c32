// The level sampler's clock by 6, its reset asserted at once and released through two flip-flops, so that everything
// behind them leaves reset before the same edge. Released late, either of them only makes all of it a cycle later.
// check: --ratio 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// reset: proved, held 0
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module level_by_6_synced (input clk, input por_n, output reg level);
  reg [1:0] ready;
  reg [1:0] count;
  wire clear = ~ready[1];
  always @(posedge clk or negedge por_n)
    if (!por_n) ready <= 2'b00;
    else ready <= {ready[0], 1'b1};
  always @(posedge clk or posedge clear)
    if (clear) begin
      count <= 2'd0;
      level <= 1'b0;
    end else if (count >= 2'd2) begin
      count <= 2'd0;
      level <= ~level;
    end else count <= count + 2'd1;
endmodule
