// Decade count that stops at 15 lest it roll over: from reset it divides by 20, from an illegal count it
// climbs to 15 and stays there. The second check excuses both findings.
// check: --ratio 20
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: proved, held 0
// from reset: period 40, high 20
// loops: 3
// false loops: 2
// stuck: yes
// check: --ratio 20 --waive 'no-stuck=the logger resets at power-up' --waive 'recovery=the watchdog resets it'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: proved, held 0
// from reset: period 40, high 20
// loops: 3
// false loops: 2
// stuck: yes
module saturates_at_15 (input clk, input rst, output reg slow);
  reg [3:0] count;
  always @(posedge clk or posedge rst)
    if (rst) begin
      count <= 4'd0;
      slow <= 1'b0;
    end else if (count == 4'd9) begin
      count <= 4'd0;
      slow <= ~slow;
    end else if (count != 4'd15)
      count <= count + 4'd1;
endmodule
