// Heater burst by 4 with its pattern in a table of four words: one of four, then three of four input cycles on.
// From 1 to 2 both bits of the count change, by way of 0 or of 3: either word of the table shows a sliver of
// another one, which the heater's relay is too slow for.
// check: --ratio 4 --high 2 --output low_power --waive 'glitch-free=the relay is slow'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// loops: 1
// false loops: 0
// check: --ratio 4 --high 6 --output high_power --waive 'glitch-free=the relay is slow'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
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
