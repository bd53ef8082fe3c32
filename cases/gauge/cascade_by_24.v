// Prescaler by 4 whose carry enables a count of 3, which toggles the output: by 24, all on one clock.
// check: --ratio 24
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// reset: proved, held 0
// from reset: period 48, high 24
// loops: 1
// false loops: 0
// check: --ratio 24 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 8, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
module enabled_count #(parameter WIDTH = 2, LAST = 3) (
  input clk, input rst, input enable, output carry
);
  reg [WIDTH-1:0] count;
  assign carry = enable & (count == LAST);
  always @(posedge clk or posedge rst)
    if (rst) count <= {WIDTH{1'b0}};
    else if (enable) count <= carry ? {WIDTH{1'b0}} : count + 1'b1;
endmodule

module cascade_by_24 (input clk, input rst, output reg slow);
  wire tick, turn;
  enabled_count prescaler (.clk(clk), .rst(rst), .enable(1'b1), .carry(tick));
  enabled_count #(2, 2) divider (.clk(clk), .rst(rst), .enable(tick), .carry(turn));
  always @(posedge clk or posedge rst)
    if (rst) slow <= 1'b0;
    else if (turn) slow <= ~slow;
endmodule
