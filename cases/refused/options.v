// A sound divider by 4 asked nonsense.
// check: --ratio 0
// error: ratio
// check: --ratio many
// error: ratio
// check: --ratio -4
// error: ratio
// check: --ratio 2.3
// error: ratio
// check: --ratio 4.5
// error: --high
// check: --ratio 4 --high 0
// error: high
// check: --ratio 4 --high 8
// error: high
// check: --ratio 4 --clock no_such_port
// error: no_such_port
// check: --ratio 4 --clock tick
// error: tick
// check: --ratio 4 --output no_such_port
// error: no_such_port
// check: --ratio 4 --reset no_such_port
// error: no_such_port
// check: --ratio 4 --reset rst=2
// error: rst
// check: --ratio 4 --reset clk
// error: clk
// check: --ratio 4 --hold no_such_port=1
// error: no_such_port
// check: --ratio 4 --hold rst
// error: hold
// check: --ratio 4 --hold rst=2
// error: rst
// check: --ratio 4 --hold clk=0
// error: clk
// check: --ratio 4 --set NO_SUCH=3
// error: NO_SUCH
// check: --ratio 4 --set WIDTH=wide
// error: WIDTH
// check: --ratio 4 --module no_such_module
// error: no_such_module
// check: --ratio 4 --start sometime
// error: start
// check: --ratio 4 --start initial
// error: initial
// check: --ratio 4 --within -1
// error: within
// check: --ratio 4 --waive beauty=later
// error: beauty
// check: --ratio 4 --waive recovery
// error: waive
// check: --ratio 4 --waive recovery=
// error: reason
// check: --ratio 4 --fin 50bananas
// error: fin
module options #(parameter WIDTH = 2) (input clk, input rst, output tick);
  reg [WIDTH-1:0] count;
  always @(posedge clk or posedge rst)
    if (rst) count <= {WIDTH{1'b0}};
    else count <= count + 1'b1;
  assign tick = count[WIDTH-1];
endmodule
