// Bucket debounce by 40 whose count has four bits and is compared with 19: it rolls over at 16 and the
// output never toggles.
// check: --ratio 40
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
// note: 33: this comparison never holds: 19
// check: --ratio 40 --start any
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// loops: 2
// false loops: 2
// stuck: yes
module compare_out_of_reach (input clk, input rst, output reg debounce);
  reg [3:0] count;
  always @(posedge clk or posedge rst)
    if (rst) begin
      count <= 4'd0;
      debounce <= 1'b0;
    end else if (count == 19) begin
      count <= 4'd0;
      debounce <= ~debounce;
    end else
      count <= count + 4'd1;
endmodule
