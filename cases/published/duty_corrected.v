// Divider with the published duty correction: by 3, 5, 7, 9 the high time is N - 1 half-cycles, and N when
// the falling edge is moved to the falling input edge.
// check: --set N=3 --set CORRECT=0 --ratio 3 --high 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 6, high 2
// loops: 1
// false loops: 0
// check: --set N=3 --set CORRECT=1 --ratio 3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 6, high 3
// loops: 1
// false loops: 0
// check: --set N=5 --set CORRECT=0 --ratio 5 --high 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 10, high 4
// loops: 1
// false loops: 0
// check: --set N=5 --set CORRECT=1 --ratio 5
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 10, high 5
// loops: 1
// false loops: 0
// check: --set N=7 --set CORRECT=0 --ratio 7 --high 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 14, high 6
// loops: 1
// false loops: 0
// check: --set N=7 --set CORRECT=1 --ratio 7
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 14, high 7
// loops: 1
// false loops: 0
// check: --set N=9 --set CORRECT=0 --ratio 9 --high 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 18, high 8
// loops: 1
// false loops: 0
// check: --set N=9 --set CORRECT=1 --ratio 9
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
module duty_corrected #(parameter N = 3, parameter CORRECT = 1) (input clk, input rst_n, output out);
  reg [3:0] count;
  reg high, longer;
  always @(posedge clk or negedge rst_n)
    if (~rst_n) begin
      count <= 4'd0;
      high <= 1'b0;
    end else begin
      count <= count < N - 1 ? count + 4'd1 : 4'd0;
      high <= count < (N - 1) / 2;
    end
  always @(negedge clk or negedge rst_n)
    if (~rst_n) longer <= 1'b0;
    else longer <= high & (CORRECT != 0);
  assign out = high | longer;
endmodule
