// The flow meter's sampling clock by any N from 2 on, at 50 %: a counter, a flip-flop that is set for the lower half of
// its counts, and for odd N a copy of that on the falling edge, which is half a cycle late, OR-ed to it. A flip-flop
// that powered up wrong just after a rising edge is right at the next one, two half-cycles later; its copy of an odd N
// takes over the wrong value in between, and is right after three.
// check: --ratio 5
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 3, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 10, high 5
// loops: 1
// false loops: 0
// check: --set N=6 --ratio 6
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 12, high 6
// loops: 1
// false loops: 0
// check: --set N=2 --ratio 2
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 2, exact
// settling: proved
// reset: proved, held 0, obligation
// from reset: period 4, high 2
// loops: 1
// false loops: 0
module flow_by_n #(parameter N = 5) (input clk, input rst, output flow);
  localparam WIDTH = $clog2(N);
  reg [WIDTH-1:0] count;
  reg lower, late;
  always @(posedge clk or posedge rst)
    if (rst) begin
      count <= {WIDTH{1'b0}};
      lower <= 1'b0;
    end else begin
      count <= count >= N - 1 ? {WIDTH{1'b0}} : count + 1'b1;
      lower <= count < N / 2;
    end
  always @(negedge clk or posedge rst)
    if (rst) late <= 1'b0;
    else late <= lower;
  assign flow = N % 2 ? lower | late : lower;
endmodule
