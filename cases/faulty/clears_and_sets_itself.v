// A flip-flop that clears itself when it is set and sets itself when it is clear, while the run bit stands:
// no half-cycle after that ever settles.
// check: --ratio 2
// verdict: refuted
// settling: refuted
module clears_and_sets_itself (input clk, output pulse);
  reg run, pulse_bit;
  wire clear, set;
  always @(posedge clk) run <= ~run;
  assign clear = run & pulse_bit;
  assign set = run & ~pulse_bit;
  always @(posedge clk or posedge clear or posedge set)
    if (clear) pulse_bit <= 1'b0;
    else if (set) pulse_bit <= 1'b1;
    else pulse_bit <= 1'b0;
  assign pulse = pulse_bit;
endmodule
