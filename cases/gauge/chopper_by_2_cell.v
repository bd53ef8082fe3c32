// The same chopper as a structure: a D flip-flop whose inverted output is fed back, brought to a known
// level by the logger's active-low reset.
// check: --ratio 2
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
// check: --ratio 2 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// loops: 1
// false loops: 0
module d_flop (input ck, input clear_n, input d, output reg q, output q_n);
  always @(posedge ck or negedge clear_n)
    if (~clear_n) q <= 1'b0;
    else q <= d;
  not invert (q_n, q);
endmodule

module chopper_by_2_cell (input sample_clk, input por_n, output drive);
  wire drive_n;
  d_flop half (.ck(sample_clk), .clear_n(por_n), .d(drive_n), .q(drive), .q_n(drive_n));
endmodule
