// The sonde's window by 8 decoded from a ripple counter: high at the counts 0 and 1. From 3 to 4 the stages fall one
// after the other, 011, 010, 000, 100, and the window opens at 000 on the way. The data sheet of the LS90 warns against
// decoded ripple outputs as clocks or strobes.
// check: --ratio 8 --high 4
// verdict: refuted
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
module sonde_by_8_decoded (input clk, output window);
  reg [2:0] q;
  wire [2:0] q_n;
  always @(posedge clk) q[0] <= ~q[0];
  always @(negedge q[0]) q[1] <= ~q[1];
  always @(negedge q[1]) q[2] <= ~q[2];
  not invert [2:0] (q_n, q);
  and decode (window, q_n[2], q_n[1]);
endmodule
