// Beacon of the logger's mast: bit 25 of a free-running count of 32 bits, without reset or initial values, toggles
// every 2^25 cycles whatever the count begins with. The bits above it don't matter.
// check: --ratio 67_108_864
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
module beacon_bit_25 (input clk, output beacon);
  reg [31:0] count;
  always @(posedge clk) count <= count + 1'b1;
  assign beacon = count[25];
endmodule
