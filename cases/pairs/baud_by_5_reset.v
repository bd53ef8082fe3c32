// The baud clock by 5 at 50 % as plain RTL, against its gates that ripple and clear themselves, which owe two timing
// obligations; and the third of the oscillator likewise, whose reset has another level and another name.
// compare: gauge/baud_by_5_ripple_reset.v
// verdict: proved
// obligation: yes
// compare: gauge/baud_by_5_ripple_reset.v --after any --lag any
// verdict: proved
// settled: 5
// obligation: yes
module baud_by_5_reset (input clk, input reset, output baud);
  reg [2:0] count;
  reg late;
  always @(posedge clk or posedge reset)
    if (reset) count <= 3'd0;
    else if (count >= 3'd4) count <= 3'd0;
    else count <= count + 3'd1;
  always @(negedge clk) late <= count[1];
  assign baud = count[2] | late;
endmodule
