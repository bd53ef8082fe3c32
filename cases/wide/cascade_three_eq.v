// Three counters to 60 000 in a row that compare by ==, each enabled by the one before, and a toggle: from 60 000 each
// has to count on to 65 536 before it is back at 0, which is 5 536 of its ticks. With all three just beyond their ends,
// just after a rising edge, that makes 5 536 * (60 000^2 + 60 000 + 1) input cycles, 39 859 864 331 072 half-cycles, by
// which a whole run of the output is too long. Worked out by hand.
// check: --ratio 432000000000000
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 39859864331072, exact
// settling: proved
// reset: proved, held 2
// from reset: period 864000000000000, high 432000000000000
module counter_60000 (input clk, input rst, input enable, output last);
  reg [15:0] count;
  assign last = enable && count == 16'd59_999;
  always @(posedge clk)
    if (rst) count <= 16'd0;
    else if (enable) count <= count == 16'd59_999 ? 16'd0 : count + 16'd1;
endmodule

module cascade_three_eq (input clk, input rst, output reg flush);
  wire first, second, third;
  counter_60000 a (clk, rst, 1'b1, first);
  counter_60000 b (clk, rst, first, second);
  counter_60000 c (clk, rst, second, third);
  always @(posedge clk)
    if (rst) flush <= 1'b0;
    else if (third) flush <= ~flush;
endmodule
