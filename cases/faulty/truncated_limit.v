// A limit of 299 in eight bits is 43: by 88 instead of 600.
// check: --ratio 600
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: period 176, high 88
// loops: 1
// false loops: 1
// note: 25: parameter LAST = 299 is cut to 8 bits: 43
// check: --ratio 88
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 176, high 88
// loops: 1
// false loops: 0
module truncated_limit #(parameter [7:0] LAST = 299) (input clk, input rst, output reg slow);
  reg [7:0] count;
  always @(posedge clk or posedge rst)
    if (rst) begin
      count <= 8'd0;
      slow <= 1'b0;
    end else if (count >= LAST) begin
      count <= 8'd0;
      slow <= ~slow;
    end else
      count <= count + 8'd1;
endmodule
