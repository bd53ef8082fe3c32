// Debounce clock of the tipping bucket without reset: an exact compare in eight bits. An illegal count runs
// to 255 before it is at home, which is long, and still a proof.
// check: --ratio 100
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 412, exact
// settling: proved
// loops: 1
// false loops: 0
// check: --ratio 100 --within 500
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 412, exact
// settling: proved
// loops: 1
// false loops: 0
module bucket_by_100 (input clk, output reg debounce);
  reg [7:0] count;
  always @(posedge clk)
    if (count == 8'd49) begin
      count <= 8'd0;
      debounce <= ~debounce;
    end else begin
      count <= count + 1'b1;
    end
endmodule
