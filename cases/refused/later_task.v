// A task, not read yet.
// check: --ratio 4
// error: task
// line: 6
module later_task (input clk, output reg tick);
  task turn;
    input level;
    tick = ~level;
  endtask
  always @(posedge clk) turn(tick);
endmodule
