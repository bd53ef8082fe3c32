// A binary counter to 200 000 000 - 1 and its Gray code in registers of their own; the output is the upper bit of the code,
// which is that of the number: 1 from 134 217 728 on, for 65 782 272 of 200 000 000 input cycles. Before the first
// rising edge the copy may be anything: with the number at its end a copy of 0 makes a whole low run 2 half-cycles longer.
// check: --ratio 200000000 --high 131564544
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 2
// from reset: period 400000000, high 131564544
module gray_copy_28 (input clk, input rst, output upper);
  reg [27:0] number, gray;
  wire [27:0] following = number >= 28'd199_999_999 ? 28'd0 : number + 28'd1;
  always @(posedge clk)
    if (rst) begin
      number <= 28'd0;
      gray <= 28'd0;
    end else begin
      number <= following;
      gray <= following ^ (following >> 1);
    end
  assign upper = gray[27];
endmodule
