// Pump clock by 2 whose toggle is a task called on the clock.
// check: --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// loops: 1
// false loops: 0
module pump_by_2_task (input clk, output reg pump);
  task turn;
    input level;
    pump <= ~level;
  endtask
  always @(posedge clk) turn(pump);
endmodule
