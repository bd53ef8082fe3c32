// Any whole ratio at 50 % for the logger's housekeeping clocks: even ratios from the rising edge alone, odd
// ones with the first half stretched by half a cycle.
// check: --ratio 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 12, high 6
// loops: 1
// false loops: 0
// check: --set N=2 --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --set N=9 --ratio 9
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 18, high 9
// loops: 1
// false loops: 0
// check: --set N=16 --ratio 16
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 32, high 16
// loops: 1
// false loops: 0
// check: --set N=255 --ratio 255
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 510, high 255
// loops: 1
// false loops: 0
// check: --set N=1000001 --ratio 1000001
// verdict: proved or open
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: proved or open, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 2000002, high 1000001
module logger_half_any #(parameter N = 6) (input clk, input rst_n, output tick);
  localparam WIDTH = $clog2(N);
  localparam ODD = N % 2;
  reg [WIDTH-1:0] count;
  reg first, late;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) begin
      count <= 0;
      first <= 1'b0;
    end else begin
      count <= (count >= N - 1) ? 0 : count + 1;
      first <= count < N / 2;
    end
  always @(negedge clk or negedge rst_n)
    if (!rst_n) late <= 1'b0;
    else late <= first;
  assign tick = ODD ? first | late : first;
endmodule
