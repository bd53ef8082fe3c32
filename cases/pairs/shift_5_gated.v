// The five-stage counter with its anti-lock gate: the third stage takes Q2 AND (Q1 OR Q3).
// compare: pairs/shift_5_plain.v --set TAP=1 --output q1
// verdict: proved
module shift_5_gated #(parameter TAP = 5) (input clk, output q1, output q3);
  reg [5:1] q = 5'b00000;
  always @(posedge clk) begin
    q <= {q[4:1], ~q[TAP]};
    q[3] <= q[2] & (q[1] | q[3]);
  end
  assign q1 = q[1];
  assign q3 = q[3];
endmodule
