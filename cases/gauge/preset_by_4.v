// Two-bit counter with an asynchronous clear and an asynchronous preset, which the calibration jig drives
// and the logger holds off.
// check: --hold preset_n=1 --ratio 4
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
// check: --hold clear=0 --reset preset_n=0 --ratio 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 8, high 4
// loops: 1
// false loops: 0
module preset_by_4 (input clk, input clear, input preset_n, output slow);
  reg [1:0] count;
  always @(posedge clk or posedge clear or negedge preset_n)
    if (clear) count <= 2'b00;
    else if (!preset_n) count <= 2'b11;
    else count <= count + 2'b01;
  assign slow = count[1];
endmodule
