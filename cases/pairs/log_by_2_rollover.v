// The logger's clock by 2 that loses an edge at each roll-over of its record count.
// compare: pairs/log_by_2.v
// verdict: refuted
// differs: 2097153
module log_by_2_rollover (input clk, input rst, output reg tick);
  reg [20:0] records;
  always @(posedge clk)
    if (rst) begin
      tick <= 1'b0;
      records <= 21'd0;
    end else if (records[20]) records <= 21'd0;
    else begin
      tick <= ~tick;
      records <= records + 21'd1;
    end
endmodule
