// Modem clock with its divisor on pins and an enable: by twice the divisor while both are held.
// check: --hold divisor=3 --hold enable=1 --ratio 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 12, high 6
// loops: 1
// false loops: 0
// check: --hold divisor=5 --hold enable=1 --ratio 10
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 20, high 10
// loops: 1
// false loops: 0
// check: --hold divisor=0 --hold enable=1 --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 12, exact
// settling: proved
// reset: proved, held 0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --hold divisor=1 --hold enable=1 --ratio 2 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 12, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
// check: --each divisor --hold enable=1 --ratio 2*max(divisor,1)
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 12, exact
// settling: proved
// reset: proved, held 0, obligation
// at: divisor=0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module modem_by_held (input clk, input rst_n, input enable, input [2:0] divisor, output reg modem);
  reg [2:0] left;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) begin
      left <= 3'd0;
      modem <= 1'b0;
    end else if (enable) begin
      if (left > 3'd1) left <= left - 3'd1;
      else begin
        left <= divisor;
        modem <= ~modem;
      end
    end
endmodule
