// The depth sampling's decode of two neighbouring Gray codes in gates, with a third AND that bridges the two: it holds
// the OR up while bit 0 goes from one to the other.
// check: --ratio 8 --high 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
module stage_by_8_bridged (input clk, output two);
  reg [2:0] gray;
  wire [2:0] gray_n;
  wire at_6, at_7, bridge;
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
  not invert [2:0] (gray_n, gray);
  and left (at_6, gray[2], gray[1], gray_n[0]);
  and right (at_7, gray[2], gray[1], gray[0]);
  and across (bridge, gray[2], gray[1]);
  or merge (two, at_6, at_7, bridge);
endmodule
