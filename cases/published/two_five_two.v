// Two-phase clock of the published 8224 pattern: by 9, phase 1 high for 2, phase 2 for 5, a gap of 2 (the
// order is from memory).
// Both phases are decoded here and pulse on the way, phase 1 from 7 to 8 and phase 2 from 5 to 6; the part has
// registers for them.
// check: --ratio 9 --high 4 --output phase1 --waive 'glitch-free=decoded for the count only'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
// check: --ratio 9 --high 10 --output phase2 --waive 'glitch-free=decoded for the count only'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
module two_five_two (input osc, output phase1, output phase2);
  reg [3:0] unit;
  always @(posedge osc)
    if (unit[3]) unit <= 4'd0;
    else unit <= unit + 4'd1;
  assign phase1 = unit < 4'd2;
  assign phase2 = unit >= 4'd2 && unit < 4'd7;
endmodule
