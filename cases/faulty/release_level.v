// Two counts of 3, one on each edge, that meet in an AND: released while the clock is low the output gives
// a pulse in three cycles, released while it is high it never moves.
// check: --ratio 3 --high 1
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// loops: 3
// false loops: 1
// stuck: yes
module release_level (input clk, input rst_n, output ping);
  reg [1:0] rising, falling;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) rising <= 2'd0;
    else rising <= rising[1] ? 2'd0 : rising + 2'd1;
  always @(negedge clk or negedge rst_n)
    if (!rst_n) falling <= 2'd0;
    else falling <= falling[1] ? 2'd0 : falling + 2'd1;
  assign ping = rising == 2'd1 & falling == 2'd0;
endmodule
