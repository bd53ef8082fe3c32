// The valve clock behind an enable that is taken as it is.
// compare: pairs/valve_falling.v
// verdict: proved
module valve_bare (input clk, input rst, input enable, output valve);
  reg half;
  always @(posedge clk)
    if (rst) half <= 1'b0;
    else half <= ~half;
  assign valve = clk & enable & half;
endmodule
