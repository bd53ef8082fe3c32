// Heater burst by 4 with its pattern in a table of four words: one of four, then three of four input cycles on.
// check: --ratio 4 --high 2 --output low_power
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 4 --high 6 --output high_power
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
module heater_by_4_table (input clk, output low_power, output high_power);
  reg [1:0] pattern [0:3];
  reg [1:0] count;
  initial begin
    pattern[0] = 2'b11;
    pattern[1] = 2'b10;
    pattern[2] = 2'b10;
    pattern[3] = 2'b00;
  end
  always @(posedge clk) count <= count + 2'd1;
  assign {high_power, low_power} = pattern[count];
endmodule
