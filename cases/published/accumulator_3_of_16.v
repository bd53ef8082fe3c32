// Four-bit accumulator with addend 3 (published: 10 MHz to 1.875 MHz, that is 16/3; gaps of 5 and 6 input
// cycles): no ratio holds from gap to gap, though every carry lasts one input cycle. On average 16/3 does.
// check: --ratio 5 --high 2
// verdict: refuted
// ratio: refuted
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: period 32
// loops: 1
// false loops: 1
// check: --ratio 5.5 --high 2
// verdict: refuted
// ratio: refuted
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: period 32
// loops: 1
// false loops: 1
// check: --ratio 16/3 --mean
// verdict: proved
// ratio: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// from reset: period 32
// loops: 1
// false loops: 0
// check: --ratio 11/2 --mean --high 2
// verdict: refuted
// ratio: refuted
// high-time: proved
// no-stuck: proved
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: period 32
// loops: 1
// false loops: 1
// check: --ratio 16/3
// error: --mean
module accumulator_3_of_16 (input clk, input rst, output reg carry);
  reg [3:0] sum;
  always @(posedge clk or posedge rst)
    if (rst) {carry, sum} <= 5'd0;
    else {carry, sum} <= sum + 5'd3;
endmodule
