// Seconds from the logger's watch crystal of 32 768 Hz: fifteen bits that roll over by themselves.
// check: --ratio 32768
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
// check: --ratio 32768 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
module watch_by_32768 (input crystal, input rst_n, output second);
  reg [14:0] count;
  always @(posedge crystal or negedge rst_n)
    if (!rst_n) count <= {15{1'b0}};
    else count <= count + 1'b1;
  assign second = count[14];
endmodule
