// A by-3 that was posted as 75 % and is 2/3 high: 00, 10, 11; the illegal 01 goes to 00 in one clock.
// check: --ratio 3 --high 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 4 --high 6
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 1
// false loops: 1
module third_posted_as_75 (input clk, output out);
  reg [1:0] count;
  always @(posedge clk) count <= {~count[0], ~count[0] & count[1]};
  assign out = count[1];
endmodule
