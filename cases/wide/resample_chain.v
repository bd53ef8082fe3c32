// A 30-bit counter's top half, resampled four times on alternating edges on its way to the modem.
// check: --ratio 800000000
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 5, exact
// settling: proved
// reset: proved, held 7
// from reset: period 1600000000, high 800000000
module resample_chain (input clk, input rst, output reg far);
  reg [29:0] count;
  reg near, s1, s2;
  always @(posedge clk)
    if (rst) count <= 30'd0;
    else if (count >= 30'd799_999_999) count <= 30'd0;
    else count <= count + 30'd1;
  always @(posedge clk) near <= count >= 30'd400_000_000;
  always @(negedge clk) s1 <= near;
  always @(posedge clk) s2 <= s1;
  always @(negedge clk) far <= s2;
endmodule
