// Scan clock of the water-stage multiplexer, an eighth of the oscillator at 50 %, counted in binary. The same in
// other codings beside it. Resampled on the falling edge it comes half a cycle later, wherever it is released.
// compare: pairs/scan_by_8_gray.v
// verdict: proved
// compare: pairs/scan_by_8_twisted.v
// verdict: proved
// compare: pairs/scan_by_8_onehot.v
// verdict: proved
// compare: pairs/scan_by_8_gates.v --new-output q2
// verdict: proved
// compare: pairs/scan_by_8_late.v
// verdict: refuted
// differs: 7
// compare: pairs/scan_by_8_late.v --lag 1
// verdict: proved
// lag: 1
// compare: pairs/scan_by_8_late.v --lag any
// verdict: proved
// lag: 1
// compare: pairs/scan_by_8_twisted.v --after any --lag any
// verdict: refuted
// compare: pairs/scan_by_8_gray.v --after any --lag any
// verdict: proved
// settled: 0
// compare: pairs/scan_by_8_gray.v --after any
// verdict: refuted
module scan_by_8_binary (input clk, input rst, output scan);
  reg [2:0] count;
  always @(posedge clk)
    if (rst) count <= 3'd0;
    else count <= count + 3'd1;
  assign scan = count[2];
endmodule
