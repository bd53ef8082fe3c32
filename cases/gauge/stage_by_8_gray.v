// Scan clock of the water-stage multiplexer: a three-bit Gray counter, one register bit changing at each
// edge. No state is illegal.
// check: --ratio 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
module stage_by_8_gray (input clk, output scan);
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
      3'b100: gray <= 3'b000;
    endcase
  assign scan = gray[2];
endmodule
