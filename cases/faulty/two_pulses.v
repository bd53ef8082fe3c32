// A decode that picks two counts out of nine that aren't neighbours: two pulses a round, of one and of two
// input cycles.
// From 3 to 4 the decode passes by 1 and by 0.
// check: --ratio 9 --high 6
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// glitch-free: refuted
// reset: refuted, held 2
// from reset: period 18
// loops: 1
// false loops: 1
module two_pulses (input clk, input rst, output ping);
  reg [3:0] count;
  always @(posedge clk)
    if (rst) count <= 4'd0;
    else if (count >= 4'd8) count <= 4'd0;
    else count <= count + 4'd1;
  assign ping = count == 4'd1 || count == 4'd4 || count == 4'd5;
endmodule
