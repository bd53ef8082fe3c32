// Bi-quinary wiring of the published '90 and '390 function tables (0, 2, 4, 6, 8, 1, 3, 5, 7, 9; Q0 high 5
// of 10): the by-5 section takes the clock, its top stage clocks stage 0. The by-5 section alone is high 1
// of 5.
// check: --hold mr2=1 --hold ms1=0 --hold ms2=0 --ratio 10 --output q0
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// from reset: period 20, high 10
// loops: 1
// false loops: 0
// check: --hold mr2=1 --hold ms1=0 --hold ms2=0 --ratio 5 --high 2 --output q3
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0
// from reset: period 10, high 2
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

module decade_biquinary (
  input clk_n, input mr1, input mr2, input ms1, input ms2, output q0, output q1, output q2, output q3
);
  decade_cell c (.cp0_n(q3), .cp1_n(clk_n), .mr1(mr1), .mr2(mr2), .ms1(ms1), .ms2(ms2),
                 .q0(q0), .q1(q1), .q2(q2), .q3(q3));
endmodule
