// Radio wake-up: a down-counter that reloads at zero; a too large count only has to run down.
// check: --ratio 20000000
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 516870912, exact
// settling: proved
// reset: proved, held 0
// from reset: period 40000000, high 20000000
module radio_down (input clk, input rst_n, output reg wake);
  reg [27:0] left;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) begin
      left <= 28'd9_999_999;
      wake <= 1'b0;
    end else if (left == 28'd0) begin
      left <= 28'd9_999_999;
      wake <= ~wake;
    end else left <= left - 28'd1;
endmodule
