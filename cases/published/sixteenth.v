// Four-bit ripple counter of the published '93 function table (0 to 15): by 2, 4, 8 and 16 at 50 %; stage 0
// is clocked from outside, the others ripple.
// check: --hold mr2=1 --ratio 16 --output q3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 32, high 16
// loops: 1
// false loops: 0
// check: --hold mr2=1 --ratio 4 --output q1
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
module sixteenth (
  input clk_n, input mr1, input mr2, output reg q0, output reg q1, output reg q2, output reg q3
);
  wire clear = mr1 && mr2;
  always @(negedge clk_n or posedge clear) if (clear) q0 <= 0; else q0 <= ~q0;
  always @(negedge q0 or posedge clear) if (clear) q1 <= 0; else q1 <= ~q1;
  always @(negedge q1 or posedge clear) if (clear) q2 <= 0; else q2 <= ~q2;
  always @(negedge q2 or posedge clear) if (clear) q3 <= 0; else q3 <= ~q3;
endmodule
