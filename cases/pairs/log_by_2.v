// The logger's clock by 2. Beside it one that also counts its records, and stands still for one input cycle when
// their number rolls over after 2^20 input cycles: the first edge that is missing is the one after 2^20 of them.
// compare: pairs/log_by_2_rollover.v
// verdict: refuted
// differs: 2097153
// compare: pairs/log_by_2_rollover.v --lag any
// verdict: refuted
module log_by_2 (input clk, input rst, output reg tick);
  always @(posedge clk)
    if (rst) tick <= 1'b0;
    else tick <= ~tick;
endmodule
