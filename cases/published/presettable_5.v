// Five-stage counter of the published 4018 function table, divided by its feedback: by 2, 4, 6, 8, 10 from
// one inverted stage, by 3, 5, 7, 9 from two gated outside (which pair is from memory; the AND gives 1/3,
// 2/5, 3/7, 4/9 high, the OR 2/3, 3/5, 4/7, 5/9, and its by-9 has a false loop of three states and one more
// that falls into it).
// check: --set TAP=1 --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=2 --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=3 --ratio 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=4 --ratio 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=5 --ratio 10
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 18, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=1 --set PAIR=1 --ratio 3 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=2 --set PAIR=1 --ratio 5 --high 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=3 --set PAIR=1 --ratio 7 --high 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=4 --set PAIR=1 --ratio 9 --high 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 6, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=1 --set PAIR=2 --ratio 3 --high 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=2 --set PAIR=2 --ratio 5 --high 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=3 --set PAIR=2 --ratio 7 --high 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --set TAP=4 --set PAIR=2 --ratio 9 --high 10
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved
// recovery: refuted
// settling: proved
// loops: 2
// false loops: 1
module presettable_5 #(parameter TAP = 5, PAIR = 0) (input clk, output q1);
  reg [5:1] q;
  wire [6:1] inverted = {1'b1, ~q};
  wire data = PAIR == 0 ? inverted[TAP]
            : PAIR == 1 ? inverted[TAP] & inverted[TAP + 1]
            : inverted[TAP] | inverted[TAP + 1];
  always @(posedge clk) begin
    q <= {q[4:1], data};
    q[3] <= q[2] & (q[1] | q[3]);
  end
  assign q1 = q[1];
endmodule
