// The scan clock by 8 as gates and flip-flops: a half adder for each bit, and AND gates for the reset.
// compare: pairs/scan_by_8_binary.v --old-output q2
// verdict: proved
// compare: pairs/scan_by_8_binary.v --old-output q1
// verdict: refuted
// differs: 3
module flip_flop (input ck, input d, output reg q);
  always @(posedge ck) q <= d;
endmodule

module scan_by_8_gates (input clk, input rst, output q0, q1, q2);
  wire run, n0, n1, n2, d0, d1, d2, carry;
  not release_n (run, rst);
  not first (n0, q0);
  xor second (n1, q1, q0);
  and both (carry, q1, q0);
  xor third (n2, q2, carry);
  and clear0 (d0, n0, run);
  and clear1 (d1, n1, run);
  and clear2 (d2, n2, run);
  flip_flop stage0 (clk, d0, q0);
  flip_flop stage1 (clk, d1, q1);
  flip_flop stage2 (clk, d2, q2);
endmodule
