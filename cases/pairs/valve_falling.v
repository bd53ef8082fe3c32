// The valve clock behind an enable that is taken at the falling edge.
// compare: pairs/valve_bare.v
// verdict: proved
module valve_falling (input clk, input rst, input enable, output valve);
  reg half, open;
  always @(posedge clk)
    if (rst) half <= 1'b0;
    else half <= ~half;
  always @(negedge clk) open <= enable;
  assign valve = clk & open & half;
endmodule
