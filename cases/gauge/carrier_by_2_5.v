// Sonde carrier at two fifths of the oscillator: high for two half-cycles in five. A flip-flop on the
// falling edge places every second pulse. Synchronous reset.
// From 3 to 4 all bits of the count change: if the lower ones come first the decode of 0 pulses. The sonde is
// narrow-band and doesn't see it.
// check: --ratio 2.5 --high 2 --waive 'glitch-free=the sonde is narrow-band'
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// glitch-free: refuted
// reset: proved, held 3
// from reset: period 5, high 2
// loops: 1
// false loops: 0
module carrier_by_2_5 (input clk, input rst, output carrier);
  reg [2:0] count;
  reg late;
  always @(posedge clk)
    if (rst) count <= 3'd0;
    else count <= count[2] ? 3'd0 : count + 3'd1;
  always @(negedge clk)
    late <= (count == 3'd2);
  assign carrier = (count == 3'd0) | late;
endmodule
