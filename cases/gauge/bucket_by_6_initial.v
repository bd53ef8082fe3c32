// Scan clock of the tipping bucket on a part that loads its registers at power-up: initial values in an
// initial block and no reset.
// check: --ratio 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// from initial: period 12, high 6
// loops: 1
// false loops: 0
// check: --ratio 6 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 6 --within 11
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// from initial: period 12, high 6
// loops: 1
// false loops: 0
module bucket_by_6_initial (input clk, output reg scan);
  reg [1:0] count;
  initial begin
    count = 2'd0;
    scan = 1'b1;
  end
  always @(posedge clk)
    if (count == 2'd2) begin
      count <= 2'd0;
      scan <= ~scan;
    end else
      count <= count + 2'd1;
endmodule
