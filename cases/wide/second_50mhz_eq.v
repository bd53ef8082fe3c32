// One-second clock of the gauge's real-time record: 50 MHz in, 1 Hz out, 32 bits, synchronous reset, exact compare.
// An illegal count has to run to 2^32 and round: (2^32 - 25 000 000) input cycles, from 25 000 000 just after a
// rising edge.
// check: --ratio 50000000 --fin 50MHz
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8539934592, exact
// settling: proved
// reset: proved, held 2
// from reset: period 100000000, high 50000000
module second_50mhz_eq (input clk, input rst, output reg second);
  reg [31:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 32'd0;
      second <= 1'b0;
    end else if (count == 25_000_000 - 1) begin
      count <= 32'd0;
      second <= ~second;
    end else count <= count + 32'd1;
endmodule
