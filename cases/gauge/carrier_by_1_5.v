// Sonde carrier at two thirds of the oscillator: a count of 3 on the rising edge and its copy on the
// falling edge pick one half-cycle in three. The ratio is half-integral, so the high time has to be stated.
// check: --ratio 1.5 --high 1 --output carrier
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0
// from reset: period 3, high 1
// loops: 1
// false loops: 0
// check: --ratio 1.5 --high 2 --output carrier_n
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0
// from reset: period 3, high 2
// loops: 1
// false loops: 0
// check: --ratio 1.5 --high 1 --output carrier --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
module carrier_by_1_5 (input clk, input rst_n, output carrier, output carrier_n);
  reg [1:0] count, copy;
  always @(posedge clk or negedge rst_n)
    if (!rst_n) count <= 2'd0;
    else case (count)
      2'd0: count <= 2'd1;
      2'd1: count <= 2'd2;
      default: count <= 2'd0;
    endcase
  always @(negedge clk or negedge rst_n)
    if (!rst_n) copy <= 2'd0;
    else copy <= count;
  assign carrier = (count == 2'd0 && copy == 2'd2) || (count == 2'd1 && copy == 2'd1);
  assign carrier_n = ~carrier;
endmodule
