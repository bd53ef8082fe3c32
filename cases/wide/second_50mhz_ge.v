// The same with a compare that no count can overshoot: whatever the count, the wave goes on as it is.
// check: --ratio 50000000 --fin 50MHz --within 3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// from reset: period 100000000, high 50000000
module second_50mhz_ge (input clk, input rst, output reg second);
  reg [31:0] count;
  always @(posedge clk)
    if (rst) begin
      count <= 32'd0;
      second <= 1'b0;
    end else if (count >= 25_000_000 - 1) begin
      count <= 32'd0;
      second <= ~second;
    end else count <= count + 32'd1;
endmodule
