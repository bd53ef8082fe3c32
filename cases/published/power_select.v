// Divider by 2^k with k on pins, of the published '294 kind (k = 2 to 15).
// check: --hold k=2 --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 8, high 4
// loops: 1
// false loops: 0
// check: --hold k=9 --ratio 512
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 1024, high 512
// loops: 1
// false loops: 0
// check: --hold k=15 --ratio 32768
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 65536, high 32768
// loops: 1
// false loops: 0
// check: --each k=3,9 --ratio 2**k
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// at: k=3
// from reset: period 16, high 8
// loops: 1
// false loops: 0
module power_select (input clk, input clear_n, input [3:0] k, output out);
  reg [14:0] count;
  wire [3:0] stage = k - 4'd1;
  always @(posedge clk or negedge clear_n)
    if (!clear_n) count <= 15'd0;
    else count <= count + 15'd1;
  assign out = count[stage];
endmodule
