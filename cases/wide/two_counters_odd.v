// Two counters on opposite edges, OR-ed to an odd ratio: right from reset, and wrong from any power-up in which they
// don't agree, for nothing ties one to the other.
// The compares pulse as well: from 24 999 999 to 25 000 000 by way of greater numbers.
// check: --ratio 50000001
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: proved, held 0
// from reset: period 100000002, high 50000001
module two_counters_odd (input clk, input rst_n, output slow);
  localparam [25:0] LAST = 50_000_000;
  localparam [25:0] HALF = 25_000_000;
  reg [25:0] up, down;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) up <= 26'd0;
    else up <= up == LAST ? 26'd0 : up + 26'd1;
  always @(negedge clk or negedge rst_n)
    if (!rst_n) down <= 26'd0;
    else down <= down == LAST ? 26'd0 : down + 26'd1;
  assign slow = (up > HALF) | (down > HALF);
endmodule
