// Depth sampling by 8 from a Gray count of three bits. One bit changes at a time, so no decode of it can pulse by
// what it computes: neither that of one code, nor that of two neighbours, in which one bit goes two ways. Gates made
// of the latter have to be free of hazards, such as those in cases/gauge/stage_by_8_bridged.v.
// check: --ratio 8 --high 2 --output one
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 8 --high 4 --output two
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: proved, obligation
// loops: 1
// false loops: 0
module stage_by_8_gray_decoded (input clk, output one, output two);
  reg [2:0] gray;
  always @(posedge clk)
    case (gray)
      3'b000: gray <= 3'b001;
      3'b001: gray <= 3'b011;
      3'b011: gray <= 3'b010;
      3'b010: gray <= 3'b110;
      3'b110: gray <= 3'b111;
      3'b111: gray <= 3'b101;
      3'b101: gray <= 3'b100;
      default: gray <= 3'b000;
    endcase
  assign one = gray == 3'b110;
  assign two = gray == 3'b110 | gray == 3'b111;
endmodule
