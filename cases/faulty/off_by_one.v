// Toggle divider meant to be by 20 that counts to 10 instead of 9: by 22.
// check: --ratio 20
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 2
// from reset: period 44, high 22
// loops: 1
// false loops: 1
// check: --ratio 22
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 10, exact
// settling: proved
// reset: proved, held 2
// from reset: period 44, high 22
// loops: 1
// false loops: 0
module off_by_one (input clk, input rst, output reg slow);
  reg [3:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 0;
      slow <= 0;
    end else if (count == 10) begin
      count <= 0;
      slow <= ~slow;
    end else
      count <= count + 1;
endmodule
