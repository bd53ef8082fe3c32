// While the reset is held and the clock is high, one net chases itself, and a flip-flop keeps what it happens to
// be: what reset leaves is not known, and with the wrong value the output is stuck.
// check: --ratio 4
// verdict: refuted
// ratio: open
// high-time: open
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: open
// loops: 2
// false loops: 1
// stuck: yes
module restless_in_reset (input clk, input rst, output tick);
  reg [1:0] count;
  reg bad;
  wire spin = rst & clk & ~spin;
  always @(posedge clk) if (rst) count <= 2'd0; else count <= count + 2'd1;
  always @(negedge clk) if (rst) bad <= spin;
  assign tick = count[1] & ~bad;
endmodule
