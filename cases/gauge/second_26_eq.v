// The one-second clock with an exact compare and a synchronous reset: a count beyond the last one has to
// run through all 26 bits before it is at home, 0.8 s at worst.
// check: --ratio 50000000
// verdict: proved or open
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: proved or open, worst 84217728, exact
// settling: proved
// reset: proved, held 2
// from reset: period 100000000, high 50000000
module second_26_eq (input fast_clk, input reset, output reg second);
  reg [25:0] count;
  always @(posedge fast_clk)
    if (reset) begin
      count <= 0;
      second <= 0;
    end else begin
      count <= count + 1;
      if (count == 24999999) begin
        count <= 0;
        second <= ~second;
      end
    end
endmodule
