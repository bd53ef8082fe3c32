// Modem clock by 10 in the blocking style: the count is advanced, folded and used within one block.
// check: --ratio 10
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 20, high 10
// loops: 1
// false loops: 0
// check: --ratio 10 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// loops: 1
// false loops: 0
module modem_by_10_blocking (input clk, input rst, output reg modem);
  reg [3:0] count;
  always @(posedge clk or posedge rst)
    if (rst) modem <= 1'b0;
    else modem <= count < 4'd5;
  always @(posedge clk or posedge rst) begin : counting
    reg [3:0] next;
    if (rst)
      count <= 4'd0;
    else begin
      next = count + 4'd1;
      if (next >= 4'd10) next = 4'd0;
      count <= next;
    end
  end
endmodule
