// A level filter made of two gates in a ring: once it has been high it holds itself, and with the enable on
// nothing ever takes it down again.
// check: --ratio 2 --hold enable=1
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: refuted
// recovery: refuted
// settling: proved
// loops: 1
// false loops: 1
// stuck: yes
// note: 17: combinational loop: keep -> seen -> keep
module keeper_of_gates (input clk, input enable, output level);
  reg half;
  wire keep, seen;
  assign keep = seen & enable;
  assign seen = keep | half;
  always @(posedge clk) half <= ~half;
  assign level = keep;
endmodule
