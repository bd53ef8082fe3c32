// The pump clock by 10 as a compare of a binary count. From 7 to 8 all four bits change, and if bit 2 falls before bit 3
// rises the count is below 4 for a moment: a pulse in the middle of the low time, whatever gates make the compare.
// check: --ratio 10 --high 8
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
module pump_by_10_compare (input clk, output pump);
  reg [3:0] count;
  always @(posedge clk) count <= count >= 4'd9 ? 4'd0 : count + 4'd1;
  assign pump = count < 4'd4;
endmodule
