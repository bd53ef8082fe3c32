// Five-stage counter of the published 4018 function table without its anti-lock gate, begun with all stages at 0 as
// in a bench measurement of a real part: with one inverted stage fed back to the data input it divides by 2, 4, 6, 8
// or 10. With the gate the first output is the same; by 2 the third never rises, as was measured, where a plain shift
// register has it high in the input cycle after the third edge.
// compare: pairs/shift_5_gated.v --set TAP=1 --output q1
// verdict: proved
// compare: pairs/shift_5_gated.v --set TAP=2 --output q1
// verdict: proved
// compare: pairs/shift_5_gated.v --set TAP=1 --output q3
// verdict: refuted
// differs: 5
// compare: pairs/shift_5_gated.v --set TAP=2 --output q3
// verdict: proved
// compare: pairs/shift_5_gated.v --set TAP=3 --output q3
// verdict: proved
// compare: pairs/shift_5_gated.v --set TAP=3 --output q1 --after any --lag any
// verdict: refuted
// compare: pairs/shift_5_gated.v --set TAP=1 --output q1 --after any --lag any
// verdict: proved
// settled: 0
module shift_5_plain #(parameter TAP = 5) (input clk, output q1, output q3);
  reg [5:1] q = 5'b00000;
  always @(posedge clk) q <= {q[4:1], ~q[TAP]};
  assign q1 = q[1];
  assign q3 = q[3];
endmodule
