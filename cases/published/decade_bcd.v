// BCD decade counter of the published '90 function table (count sequence 0 to 9; Q3 high 2 of 10): stage 0
// clocks the by-5 section. The cell's equations are from memory. Reset and set-to-9 pins as in its table:
// set overrides.
// check: --hold mr2=1 --hold ms1=0 --hold ms2=0 --ratio 10 --high 4 --output q3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// reset: proved, held 0
// from reset: period 20, high 4
// loops: 1
// false loops: 0
// check: --hold mr2=1 --hold ms1=0 --hold ms2=0 --ratio 2 --output q0
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 4, high 2
// loops: 1
// false loops: 0
// check: --hold mr2=1 --hold ms1=0 --hold ms2=0 --ratio 10 --high 4 --output q3 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 4, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
module jk_stage (input ck_n, input clear, input preset, input j, input k, output reg q);
  always @(negedge ck_n or posedge clear or posedge preset)
    if (clear) q <= 1'b0;
    else if (preset) q <= 1'b1;
    else case ({j, k})
      2'b01: q <= 1'b0;
      2'b10: q <= 1'b1;
      2'b11: q <= ~q;
      default: q <= q;
    endcase
endmodule

module decade_cell (
  input cp0_n, input cp1_n, input mr1, input mr2, input ms1, input ms2,
  output q0, output q1, output q2, output q3
);
  wire nine, clear, q3_n, both;
  and set9 (nine, ms1, ms2);
  and set0 (clear, mr1, mr2, ~nine);
  not not_top (q3_n, q3);
  and carry (both, q1, q2);
  jk_stage stage0 (cp0_n, clear, nine, 1'b1, 1'b1, q0);
  jk_stage stage1 (cp1_n, clear | nine, 1'b0, q3_n, 1'b1, q1);
  jk_stage stage2 (q1, clear | nine, 1'b0, 1'b1, 1'b1, q2);
  jk_stage stage3 (cp1_n, clear, nine, both, 1'b1, q3);
endmodule

module decade_bcd (
  input clk_n, input mr1, input mr2, input ms1, input ms2, output q0, output q1, output q2, output q3
);
  decade_cell c (clk_n, q0, mr1, mr2, ms1, ms2, q0, q1, q2, q3);
endmodule
