// Duty cycle of the sampling pump: on for 30 000 and off for 1 000 000 input cycles; the limit hangs on the output.
// check: --ratio 1030000 --high 60000
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 2
// from reset: period 2060000, high 60000
module pump_uneven (input clk, input rst, output reg pump);
  reg [23:0] count;
  wire [23:0] last = pump ? 24'd29_999 : 24'd999_999;
  always @(posedge clk)
    if (rst) begin
      count <= 24'd0;
      pump <= 1'b0;
    end else if (count >= last) begin
      count <= 24'd0;
      pump <= ~pump;
    end else count <= count + 24'd1;
endmodule
