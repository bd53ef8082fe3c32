// By 3 at 50 % of three flip-flops without reset (published worked example; gate choice from memory): the
// first two count, the third repeats the second on the falling edge.
// check: --ratio 3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
module third_three_flops (input clk, output out);
  reg q1, q2, q3;
  wire empty;
  nor guess (empty, q1, q2);
  always @(posedge clk) begin
    q1 <= empty;
    q2 <= q1;
  end
  always @(negedge clk) q3 <= q2;
  or merge (out, q2, q3);
endmodule
