"""Sources that strangers might send to break the reader, or to keep it busy for ever."""

from __future__ import annotations

PORTS = "module m (input clk, input a, output q);\n"


def _module(body: str) -> str:
    return f"{PORTS}{body}\nendmodule\n"


def _tree(depth: int) -> str:
    """Modules that each contain two of the next: 2^depth instances."""
    levels = [f"module m{i} (input clk); m{i + 1} a (clk), b (clk); endmodule\n" for i in range(depth)]
    return (
        _module("m0 u (clk); assign q = a;") + "".join(levels) + f"module m{depth} (input clk); endmodule\n"
    )


# Name: source, and words of the message.
REFUSED = {
    "macros that double": (
        "`define A0 x x\n" + "".join(f"`define A{i + 1} `A{i} `A{i}\n" for i in range(40)) + "`A40",
        "macros expand without measure",
    ),
    "empty macros that double": (
        "`define A0\n" + "".join(f"`define A{i + 1} `A{i} `A{i}\n" for i in range(40)) + "`A40",
        "macros expand without measure",
    ),
    "macro arguments that multiply": (
        "`define D(x) x x x x x x x x\n" + "`D(" * 20 + "a" + ")" * 20,
        "macros expand without measure",
    ),
    "a macro of itself": ("`define A `A\n" + _module("assign q = `A;"), "expands to itself"),
    "macros of each other": (
        "`define A `B\n`define B 1 + `A\n" + _module("assign q = `A;"),
        "expands to itself",
    ),
    "a macro of itself by its arguments": (
        "`define A(x) `B(x)\n`define B(x) `A(x)\n" + _module("assign q = `A(1);"),
        "expands to itself",
    ),
    "an endless generate": (
        _module("genvar i; for (i = 0; i < 2; i = i) begin : g wire w; end assign q = a;"),
        "generate for never ends",
    ),
    "a generate round and round": (
        _module("genvar i; for (i = 0; i != 3; i = i + 2) begin : g wire w; end assign q = a;"),
        "more than 10000",
    ),
    "generates inside generates": (
        _module(
            "genvar i, j, k; for (i = 0; i < 999; i = i + 1) begin : g for (j = 0; j < 999; j = j + 1) begin : h\n"
            "for (k = 0; k < 999; k = k + 1) begin : l wire w; end end end assign q = a;"
        ),
        "more than 10000",
    ),
    "an endless for": (
        _module(
            "reg r; integer i; always @* begin r = a; for (i = 0; i < 2; i = i) r = ~r; end assign q = r;"
        ),
        "runs more than",
    ),
    "an endless while": (
        _module("reg r; always @* begin r = a; while (1) r = ~r; end assign q = r;"),
        "runs more than",
    ),
    "an endless while over nothing": (
        _module("reg r; always @* begin r = a; while (1) ; end assign q = r;"),
        "never ends",
    ),
    "a repeat without measure": (
        _module("reg r; always @* begin r = a; repeat (1 << 30) r = ~r; end assign q = r;"),
        "runs more than",
    ),
    "loops inside loops": (
        _module(
            "reg r; integer i, j; always @* begin r = a; for (i = 0; i < 4000; i = i + 1)\n"
            "for (j = 0; j < 4000; j = j + 1) r = ~r; end assign q = r;"
        ),
        "unrolling takes more than",
    ),
    "a function without end": (
        _module("function automatic f(input x); f = f(x); endfunction assign q = f(a);"),
        "calls itself without end",
    ),
    "a function that calls itself twice": (
        _module(
            "function automatic integer f(input integer x); f = x < 2 ? x : f(x - 1) + f(x - 2); endfunction\n"
            "localparam P = f(60); assign q = P;"
        ),
        "unrolling takes more than",
    ),
    "a module inside itself": (
        "module m (input clk); k u (clk); endmodule\nmodule k (input clk); k u (clk); endmodule\n",
        "nest more than",
    ),
    "a tree of modules": (_tree(40), "more than 10000"),
    "an array of instances without measure": (
        _module("k u [99999999:0] (clk); assign q = a;") + "module k (input c); endmodule\n",
        "more than 10000",
    ),
    "a vector without measure": (_module("reg [1 << 30:0] r; assign q = a;"), "a vector of"),
    "a vector with enormous bounds": (
        _module(f"wire [{'9' * 400}:{'9' * 399}8] r; assign q = a;"),
        "a vector of",
    ),
    "a memory without measure": (_module("reg [7:0] r [0:1 << 29]; assign q = a;"), "a memory of"),
    "a memory of wide words": (_module("reg [8191:0] r [0:255]; assign q = a;"), "a memory of"),
    "a replication without measure": (_module("assign q = ^{1 << 30{a}};"), "a replication of"),
    "replications of replications": (_module("assign q = ^{999{{999{{999{a}}}}}};"), "bits"),
    "a negative replication": (_module("assign q = ^{-5{a}};"), "a replication of"),
    "a number of many bits": (_module("assign q = 99999999'd1;"), "a width of"),
    "a number of many digits": (_module(f"assign q = 'd{'9' * 30_000};"), "digits"),
    "a plain number of many digits": (_module(f"assign q = {'9' * 30_000};"), "digits"),
    "a cast to many bits": (_module("assign q = ^99999999'(a);"), "a cast to"),
    "generate blocks nested deeply": (
        _module("if (1) begin " * 2000 + "end " * 2000 + "assign q = a;"),
        "nest more than",
    ),
    "parameters in a circle": (_module("parameter A = B, B = C, C = A; assign q = A;"), "defined by itself"),
    "a table of nonsense": (
        "primitive p (o, i); output o; input i; table "
        + "0 : 1; " * 10
        + "9 : 1; endtable endprimitive\n"
        + _module("p u (q, a);"),
        "no place in a table",
    ),
    "ten thousand drivers": (_module("assign q = a;" * 10_000), "driven twice"),
    "an open comment": (_module("assign q = a;") + "/*" * 100_000, "comment never ends"),
    "an open string": (_module('assign q = "' + "a" * 100_000), "string never ends"),
    "brackets that never close": (_module("assign q = " + "(" * 100_000), "syntax error"),
    "conditionals that never close": ("`ifdef A\n" * 50_000, "no `endif"),
    "control bytes": ("\x00\x01\x1b[2J" + _module("assign q = a;"), "no place in Verilog"),
    "a circle of wires, thousands of them": (
        _module(
            "".join(f"wire w{i} = w{(i + 1) % 3000} ^ w{(i + 7) % 3000};\n" for i in range(3000))
            + "assign q = w0;"
        ),
        "too many combinational loops",
    ),
}

# Huge, and legal.
READ = {
    "brackets nested deeply": _module("assign q = " + "(" * 20_000 + "a" + ")" * 20_000 + ";"),
    "operators nested deeply": _module("assign q = " + "~" * 20_000 + "a;"),
    "a sum of many terms": _module("assign q = " + " + ".join(["a"] * 20_000) + ";"),
    "conditions nested deeply": _module("assign q = " + "a ? clk : " * 10_000 + "a;"),
    "many else-ifs": _module(
        "reg r; always @* "
        + "".join(f"if (a == {i}) r = {i % 2}; else " for i in range(2000))
        + "r = a; assign q = r;"
    ),
    "blocks nested deeply": _module(
        "reg r; always @* " + "begin " * 10_000 + "r = a;" + " end" * 10_000 + " assign q = r;"
    ),
    "parity of the widest vector": _module(
        "reg [8191:0] r; always @(posedge clk) r <= {r[8190:0], a}; assign q = ^r;"
    ),
    "the largest memory": _module(
        "reg r [0:4095]; reg [11:0] n; always @(posedge clk) begin n <= n + 1; r[n] <= a; end assign q = r[n];"
    ),
    "a table of constants": _module(
        "reg [7:0] r [0:1999]; reg [10:0] n; integer i; initial for (i = 0; i < 2000; i = i + 1) r[i] = i * 7;\n"
        "always @(posedge clk) n <= n + 1; assign q = r[n][0];"
    ),
    "a case of many labels": _module(
        "reg [11:0] n; reg [11:0] s; always @(posedge clk) case (n)\n"
        + "".join(f"{i}: n <= {(i * 5 + 1) % 4096};\n" for i in range(4096))
        + "endcase assign q = n[3];"
    ),
    "a variable select of the widest vector": _module(
        "reg [8191:0] r; reg [12:0] n; always @(posedge clk) begin n <= n + 1; r[n] <= a; end assign q = r[n];"
    ),
    "parameters that hang on one another": _module(
        "".join(f"localparam P{i + 1} = P{i} + 1;\n" for i in range(5000)).replace("P0 + 1", "1")
        + "assign q = P5000;"
    ),
    "a name of a million letters": _module(f"wire {'n' * 1_000_000} = a; assign q = a;"),
    "a chain of wires": _module(
        "wire w0 = a;" + "".join(f"wire w{i + 1} = ~w{i};\n" for i in range(5_000)) + "assign q = w5000;"
    ),
    "thousands of ports": f"module m ({', '.join(f'input i{k}' for k in range(5000))}, output q); assign q = i7; endmodule\n",
    "shifts by enormous amounts": _module(
        "assign q = (a << 4294967295) | (8'd1 >> 64'hffff_ffff_ffff_ffff);"
    ),
    "a power without measure": _module("localparam P = 3 ** 1_000_000_000; assign q = P;"),
}
