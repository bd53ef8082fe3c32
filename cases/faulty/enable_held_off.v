// The modem clock with its enable held at zero: stuck from every state.
// check: --hold enable=0 --ratio 8
// verdict: refuted
// ratio: refuted
// high-time: refuted
// no-stuck: refuted
// recovery: refuted
// settling: proved
// reset: refuted, held 0
// from reset: never toggles
// loops: 8
// false loops: 8
// stuck: yes
// check: --hold enable=1 --ratio 8
// verdict: proved
// ratio: proved
// high-time: proved
// no-stuck: proved
// recovery: proved, worst 0, exact
// settling: proved
// reset: proved, held 0
// from reset: period 16, high 8
// loops: 1
// false loops: 0
module enable_held_off (input clk, input rst, input enable, output modem);
  reg [2:0] count;
  always @(posedge clk or posedge rst)
    if (rst) count <= 3'd0;
    else if (enable) count <= count + 3'd1;
  assign modem = count[2];
endmodule
