// An exact compare in six bits that recovers, and later than the limit that the mission allows.
// check: --ratio 20 --within 50
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: refuted, worst 108, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 20 --within 108
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 108, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 20 --within 107
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: refuted, worst 108, exact
// settling: proved
// loops: 1
// false loops: 0
module late_for_its_limit (input clk, output reg slow);
  reg [5:0] count;
  always @(posedge clk) begin
    count <= count + 6'd1;
    if (count == 6'd9) begin
      count <= 6'd0;
      slow <= ~slow;
    end
  end
endmodule
