// One-second clock of the logger from its 50 MHz oscillator: a 26-bit counter and a toggle. The compare is
// >=, so every count is at home at the next edge. Asynchronous reset, active high.
// check: --ratio 50000000
// verdict: proved or open
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: proved or open, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 100000000, high 50000000
module second_26_ge (input fast_clk, input reset, output reg second);
  reg [25:0] count;
  always @(posedge fast_clk or posedge reset)
    if (reset) begin
      count <= 26'd0;
      second <= 1'b0;
    end else if (count >= 26'd24_999_999) begin
      count <= 26'd0;
      second <= ~second;
    end else
      count <= count + 26'd1;
endmodule
