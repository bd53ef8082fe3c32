// The one-second clock in an integer, compared with >=. An integer is signed, so its negative half counts
// up through 2^31 values first: 43 s at worst. Synchronous active-low reset.
// check: --ratio 50000000
// verdict: proved or open
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: proved or open, worst 4294967296, exact
// settling: proved
// reset: proved, held 2
// from reset: period 100000000, high 50000000
module second_32_ge (fast_clk, rst_n, second);
  input fast_clk, rst_n;
  output second;
  reg second;
  integer count;
  always @(posedge fast_clk)
    if (!rst_n) begin
      count <= 0;
      second <= 1'b0;
    end else if (count >= 25000000 - 1) begin
      count <= 0;
      second <= ~second;
    end else
      count <= count + 1;
endmodule
