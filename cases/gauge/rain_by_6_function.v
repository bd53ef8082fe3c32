// Rain gauge sampling by 6: a count whose next value is a function of it, and a task that names its levels.
// From 1 to 2 the count may be 3 for a moment, and the output with it low: it enables the sampling and clocks
// nothing.
// check: --ratio 6 --waive 'glitch-free=an enable'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// from reset: period 12, high 6
// loops: 1
// false loops: 0
// check: --ratio 6 --start any --waive 'glitch-free=an enable'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 2
// loops: 1
// false loops: 0
module rain_by_6_function (input clk, input rst, output reg rain);
  reg [2:0] count;

  function [2:0] following;
    input [2:0] value;
    input [2:0] last;
    if (value >= last) following = 3'd0;
    else following = value + 3'd1;
  endfunction

  task show;
    input [2:0] value;
    rain = value < 3'd3;
  endtask

  always @(posedge clk)
    if (rst) count <= 3'd0;
    else count <= following(count, 3'd5);
  always @* show(count);
endmodule
