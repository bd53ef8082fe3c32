// The input clock for the pump's driver, gated: the enable is taken by a flip-flop on the falling edge, so that it
// changes while the clock is low.
// check: --ratio 1 --moving run
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// enable: proved, back 2, exact, parked 0
// from reset: period 2, high 1
// loops: 1
// false loops: 0
module pump_gated_falling (input wire clk, rst, run, output wire pump);
  reg held;
  always @(negedge clk or posedge rst)
    if (rst) held <= 1'b0;
    else held <= run;
  assign pump = clk & held;
endmodule
