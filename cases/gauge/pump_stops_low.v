// Clock of the sampling pump by 6 that stops its own counter, but only at the end of a low pulse.
// check: --ratio 6 --moving run
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 2
// enable: proved, back 0, exact, parked 0
// from reset: period 12, high 6
// loops: 1
// false loops: 0
module pump_stops_low (input wire clk, rst, run, output reg pump);
  reg [1:0] count;
  wire last = count == 2'd2;
  always @(posedge clk)
    if (rst) {pump, count} <= 3'd0;
    else if (!last) count <= count + 2'd1;
    else if (pump | run) {pump, count} <= {~pump, 2'd0};
endmodule
