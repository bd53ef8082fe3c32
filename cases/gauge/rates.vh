// Rates of the logger's clocks, in input cycles.
`ifndef RATES_VH
`define RATES_VH
`define SLOW_RATE 12
`define FAST_RATE 4
`define HALF(rate) ((rate) / 2)
`endif
