// The one-second clock in 32 bits with an exact compare, an asynchronous active-low reset and the limits as
// parameters: an illegal count takes 85 s to come home.
// check: --ratio 50000000
// verdict: proved or open
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: proved or open, worst 8539934592, exact
// settling: proved
// reset: proved, held 0
// from reset: period 100000000, high 50000000
module second_32_eq #(
  parameter FAST_HZ = 50_000_000,
  parameter SLOW_HZ = 1
) (
  input fast_clk,
  input rst_n,
  output second
);
  localparam [31:0] LAST = FAST_HZ / (2 * SLOW_HZ) - 1;
  reg [31:0] count;
  reg level;
  wire wrap = count == LAST;
  always @(posedge fast_clk, negedge rst_n)
    if (!rst_n) count <= 32'b0;
    else count <= wrap ? 32'b0 : count + 32'b1;
  always @(posedge fast_clk, negedge rst_n)
    if (!rst_n) level <= 1'b0;
    else if (wrap) level <= !level;
  assign second = level;
endmodule
