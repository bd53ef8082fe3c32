// Sonde carrier at two ninths of the oscillator: a count of 9, high for four half-cycles in nine; the
// second pulse of each round is placed by a flip-flop on the falling edge.
// check: --ratio 4.5 --high 4
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 9, high 4
// loops: 1
// false loops: 0
// check: --ratio 4.5 --high 4 --start any
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// loops: 1
// false loops: 0
module carrier_by_4_5 (input clk, input rst, output carrier);
  reg [3:0] count;
  reg early, late;
  always @(posedge clk or posedge rst)
    if (rst) begin
      count <= 4'd0;
      early <= 1'b0;
    end else begin
      count <= (count > 4'd7) ? 4'd0 : count + 4'd1;
      early <= count < 4'd2;
    end
  always @(negedge clk or posedge rst)
    if (rst) late <= 1'b0;
    else late <= (count == 4'd5) | (count == 4'd6);
  assign carrier = early | late;
endmodule
