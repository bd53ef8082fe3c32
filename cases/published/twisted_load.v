// Twisted ring that loads 10...0 when its first and last stage are empty (textbook form, from memory): home
// in N - 1 clocks at worst, from every state. Output first is the first stage; output flagged is the same
// inverted while the code is illegal, so that it is right only when the ring is, and its worst recovery is
// the published number of clocks, two half-cycles each.
// A step of the ring changes one bit, so no order of changes can make flagged pulse; but that bit takes two ways
// into the check of the code, and gates made of the subtraction may.
// check: --set N=3 --ratio 6 --output flagged
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
// check: --set N=3 --ratio 6 --output first
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set N=4 --ratio 8 --output flagged
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
// check: --set N=4 --ratio 8 --output first
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set N=5 --ratio 10 --output flagged
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
// check: --set N=5 --ratio 10 --output first
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set N=6 --ratio 12 --output flagged
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 10, exact
// settling: proved
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
// check: --set N=6 --ratio 12 --output first
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// loops: 1
// false loops: 0
module twisted_load #(parameter N = 4) (input clk, output first, output flagged);
  reg [N:1] q;
  always @(posedge clk)
    if (~q[1] & ~q[N]) q <= {{N-1{1'b0}}, 1'b1};
    else q <= {q[N-1:1], ~q[N]};
  wire [N:1] turn = q ^ {q[N-1:1], ~q[N]};
  wire illegal = |(turn & (turn - 1'b1));
  assign first = q[1];
  assign flagged = q[1] ^ illegal;
endmodule
