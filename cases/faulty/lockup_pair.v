// A count of 12 in four bits whose illegal counts 13 and 14 send each other round, and whose 15 stays: one
// false loop that goes on toggling too fast, and one that is stuck.
// From 7 to 8 the compare passes by counts below 6.
// check: --ratio 12
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: refuted
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: proved, held 0
// from reset: period 24, high 12
// loops: 3
// false loops: 2
// stuck: yes
module lockup_pair (input clk, input rst_n, output slow);
  reg [3:0] count;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) count <= 4'd0;
    else case (count)
      4'd11: count <= 4'd0;
      4'd12: count <= 4'd15;
      4'd14: count <= 4'd13;
      4'd15: count <= 4'd15;
      default: count <= count + 4'd1;
    endcase
  assign slow = count >= 4'd6 && count != 4'd13;
endmodule
