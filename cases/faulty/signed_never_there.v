// A four-bit signed count, at most 7, compared with 9: the output is stuck.
// check: --ratio 20
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: never toggles
// loops: 2
// false loops: 2
// stuck: yes
// note: 23: this comparison never holds: 9
module signed_never_there (input clk, input rst_n, output reg slow);
  reg signed [3:0] count;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) begin
      count <= 0;
      slow <= 0;
    end else begin
      count <= count + 1;
      if (count >= 9) begin
        count <= 0;
        slow <= ~slow;
      end
    end
endmodule
