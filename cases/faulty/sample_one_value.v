// Sampling clock with a 24-bit divisor on pins and a decode too many: the divisor of the old pressure cell, 70000, is
// loaded as 70001. It divides by 2·(div + 1) for all values but this one of 16 777 216.
// check: --each div --ratio 2*(div+1)
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: proved or open
// recovery: refuted
// settling: proved
// reset: refuted, held 0, obligation
// at: div=70000
// from reset: period 280008, high 140004
// check: --each div=70001..16777215 --ratio 2*(div+1)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 33414428, exact
// settling: proved
// reset: proved, held 0, obligation
// at: div=70001
// from reset: period 280008, high 140004
module sample_one_value (input clk, input rst_n, input [23:0] div, output reg sample);
  reg [23:0] left;
  wire [23:0] load = div == 24'd70000 ? 24'd70001 : div;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) begin
      left <= 24'd0;
      sample <= 1'b0;
    end else if (left == 24'd0) begin
      left <= load;
      sample <= ~sample;
    end else left <= left - 24'd1;
endmodule
