// A pump clock by 20 000 000: a prescaler by 10 000 000 moves a one-hot ring of four along, and the OR of two stages that
// are not neighbours is the output. On the ring's own codes at most one of the two moves at a step. From 0011 one would
// fall as the other rises, but such a code is not good: its high time is too long. The slowest code is 0111 with the
// prescaler just begun: high for three steps, of which the last is good, so 2 * 20 000 000 half-cycles go by.
// check: --ratio 20000000
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 40000000, exact
// settling: proved
// reset: proved, held 2
// from reset: period 40000000, high 20000000
module pump_by_ring_20m (input clk, input rst, output pump);
  reg [23:0] wait_for;
  reg [3:0] ring;
  wire step = wait_for >= 24'd9_999_999;
  always @(posedge clk)
    if (rst) begin
      wait_for <= 24'd0;
      ring <= 4'b0001;
    end else begin
      wait_for <= step ? 24'd0 : wait_for + 24'd1;
      if (step) ring <= {ring[2:0], ~|ring[2:0]};
    end
  assign pump = ring[0] | ring[2];
endmodule
