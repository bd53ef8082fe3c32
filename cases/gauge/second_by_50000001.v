// An oscillator that runs one count fast, divided to a second at exactly 50 %: the first half is one flip-
// flop on the rising edge and one on the falling edge, OR-ed.
// check: --ratio 50000001
// verdict: proved or open
// ratio: proved
// high-time: proved
// no-stuck: proved or open
// recovery: proved or open, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 100000002, high 50000001
module second_by_50000001 (input clk, input rst, output slow);
  reg [25:0] count;
  reg first, late;
  always @(posedge clk or posedge rst)
    if (rst) begin
      count <= 26'd0;
      first <= 1'b0;
    end else begin
      if (count >= 26'd50_000_000) count <= 26'd0;
      else count <= count + 26'd1;
      first <= count < 26'd25_000_000;
    end
  always @(negedge clk or posedge rst)
    if (rst) late <= 1'b0;
    else late <= first;
  assign slow = first | late;
endmodule
