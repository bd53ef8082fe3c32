"""Construct by construct, a small divider that hangs on each: what the reader has to take, and what it has to refuse.

Every accepted divider comes to another wave, or to none, where its construct is misread. A source that the event
simulator can't read even as SystemVerilog has an equivalent plain one beside it.
"""

from __future__ import annotations

from dataclasses import dataclass

PORTS = "input clk, output tick"


@dataclass(frozen=True)
class Accepted:
    """A divider by `ratio`, `high` half-cycles high, from every power-up state or, with `wrong`, not from every one.

    system   the simulator reads it as SystemVerilog
    plain    what the simulator reads instead, with registers of the same names
    holds    inputs that stand still
    note     words of a note that accompanies the verdict, and its line
    """

    name: str
    text: str
    ratio: str = "4"
    high: int | None = None
    system: bool = False
    plain: str = ""
    holds: tuple[tuple[str, int], ...] = ()
    module: str | None = None
    wrong: bool = False
    note: str = ""
    line: int = 0


@dataclass(frozen=True)
class Refused:
    """A source with words of the message that refuses it, and the line that it points at."""

    name: str
    text: str
    words: str
    line: int


def module(body: str, ports: str = PORTS) -> str:
    return f"module d ({ports});\n{body}\nendmodule\n"


COUNT = "reg [1:0] n; always @(posedge clk) n <= n + 2'd1;"
STAGE = "module stage (input ck, output reg q); always @(posedge ck) q <= ~q; endmodule\n"
COUNTER = """\
module counter (k, n);
  parameter LAST = 1;
  input k; output reg [2:0] n;
  always @(posedge k) if (n >= LAST) n <= 0; else n <= n + 1;
endmodule
"""

# -- what the survey found ---------------------------------------------------------------------------------

SURVEY = [
    Accepted(
        "generate if without the keyword",
        module(f"{COUNT}\nparameter P = 1; if (P) assign tick = n[1]; else assign tick = n[0];"),
    ),
    Accepted(
        "generate for without the keyword",
        module(
            "wire [2:0] c; assign c[0] = clk; assign tick = c[2]; genvar i;\n"
            "for (i = 0; i < 2; i = i + 1) begin : s stage u (c[i], c[i + 1]); end"
        )
        + STAGE,
    ),
    Accepted(
        "inline genvar",
        module(
            "wire [3:0] c; assign c[0] = clk; assign tick = c[3];\n"
            "for (genvar i = 0; i < 3; i++) begin : s stage u (c[i], c[i + 1]); end"
        )
        + STAGE,
        "8",
        system=True,
    ),
    Accepted(
        "generate case",
        module(
            f"{COUNT} parameter P = 2;\n"
            "generate case (P) 0, 1: assign tick = n[0]; 2: assign tick = n[1]; default: assign tick = 0;\n"
            "endcase endgenerate"
        ),
    ),
    Accepted(
        "'0 and '1",
        module(
            "reg [2:0] n; always @(posedge clk) if (n == '1) n <= 3; else n <= n + 1;\n"
            "assign tick = (n ^ '0) >= 6;"
        ),
        "5",
        4,
        system=True,
    ),
    Accepted(
        "parameter int",
        module(
            "parameter int LAST = 5, HALF = 3; reg [2:0] n;\n"
            "always @(posedge clk) n <= n >= LAST ? 0 : n + 1; assign tick = n < HALF;"
        ),
        "6",
        system=True,
    ),
    Accepted(
        "parameter logic [1:0]",
        module(
            "parameter logic [1:0] LAST = 6; reg [2:0] n;\n"
            "always @(posedge clk) n <= n >= LAST ? 0 : n + 1; assign tick = n == 0;"
        ),
        "3",
        2,
        system=True,
        note="cut to 2 bits",
        line=2,
    ),
    Accepted("comments that aren't UTF-8", module(f"{COUNT} // 5 \udcb5s\n/* \udcff */ assign tick = n[1];")),
    Accepted(
        "initial values in an ANSI port list",
        "module d (input clk, output reg tick = 1'b0);\nalways @(posedge clk) tick <= ~tick;\nendmodule\n",
        "2",
    ),
    Accepted(
        "typedef enum",
        module(
            "typedef enum logic [1:0] {LOW, RISE = 3, HIGH = 1, FALL = 2} step; step s;\n"
            "always @(posedge clk) case (s) LOW: s <= RISE; RISE: s <= HIGH; HIGH: s <= FALL; default: s <= LOW; endcase\n"
            "assign tick = s == RISE || s == HIGH;"
        ),
        system=True,
    ),
    Accepted("++", module("reg [1:0] n; always @(posedge clk) n++; assign tick = n[1];"), system=True),
    Accepted(
        "timeunit", module(f"timeunit 1ns; timeprecision 1ps; {COUNT} assign tick = n[1];"), system=True
    ),
    Accepted(
        "defparam",
        module("wire [2:0] n; counter c (clk, n); defparam c.LAST = 5; assign tick = n < 3;") + COUNTER,
        "6",
    ),
    Accepted(
        "a user-defined primitive",
        module(
            f"{COUNT} wire t, z; pick u (t, n[0], z, clk), v (z, clk, n[0], n[1]); assign tick = t & n[1] & n[0];"
        )
        + "primitive pick (o, s, a, b); output o; input s, a, b;\n"
        "table 0 1 ? : 1; 0 0 ? : 0; 1 ? 1 : 1; 1 ? 0 : 0; endtable endprimitive\n",
        "4",
        1,
    ),
    Accepted("`resetall", "`resetall\n`timescale 1ns/1ps\n" + module(f"{COUNT} assign tick = n[1];")),
    Accepted(
        "task t();",
        module("reg [1:0] n; task t(); n = n + 1; endtask always @(posedge clk) t(); assign tick = n[1];"),
        system=True,
    ),
    Accepted(
        "function arguments with types",
        module(
            "function [2:0] f; input reg [2:0] a; input integer b; f = a >= b ? 0 : a + 1; endfunction\n"
            "reg [2:0] n; always @(posedge clk) n <= f(n, 5); assign tick = n < 3;"
        ),
        "6",
    ),
    Accepted(
        "function arguments in ANSI style",
        module(
            "function automatic [2:0] f(input [2:0] a, b, input s); f = s ? a >= b ? 0 : a + 1 : a; endfunction\n"
            "reg [2:0] n; always @(posedge clk) n <= f(n, 3'd5, 1'b1); assign tick = n < 3;"
        ),
        "6",
    ),
    Accepted(
        "a test bench with delays in the same file",
        module(f"{COUNT} assign tick = n[1];")
        + "module bench; reg c; wire t; d dut (c, t); initial begin c = 0; #100 $finish; end\n"
        "always #5 c = ~c; endmodule\n",
        note="test bench",
        line=4,
    ),
    Accepted(
        "a comment on the last line without a newline", module(f"{COUNT} assign tick = n[1];") + "// end"
    ),
    Accepted(
        "end labels",
        "module d (input clk, output tick);\nreg [1:0] n;\nalways @(posedge clk) begin : b n <= n + 1; end : b\n"
        "function f(input a); f = a; endfunction : f\nassign tick = f(n[1]);\nendmodule : d\n",
        system=True,
    ),
    Accepted(
        "size casts",
        module("reg [1:0] n; always @(posedge clk) n <= 2'(n + 1); assign tick = 2'(n + 2) < 2;"),
        system=True,
    ),
    Accepted(
        "logic x = 0",
        module(
            "logic x = 0; logic [1:0] n = 2'd1; always @(posedge clk) begin n <= n + 1; x <= n[1]; end\n"
            "assign tick = x;"
        ),
        system=True,
    ),
    Accepted(
        "reg a = 0, b = 0;",
        module("reg a = 0, b = 1; always @(posedge clk) begin a <= ~b; b <= a; end assign tick = a;"),
    ),
    Accepted("@(posedge(clk))", module("reg n; always @(posedge(clk)) n <= !n; assign tick = n;"), "2"),
    Accepted(
        "default without a colon",
        module(
            "reg [1:0] n; always @(posedge clk) case (n) 0: n <= 1; 1: n <= 2; default n <= 0; endcase\n"
            "assign tick = n == 0;"
        ),
        "3",
        2,
    ),
    Accepted(".*", module("wire ck, q; assign ck = clk, tick = q; stage u (.*);") + STAGE, "2", system=True),
    # Traps of the tree.
    Accepted(
        "a lone semicolon",
        module(f"; {COUNT};; assign tick = n[1];"),
        plain=module(f"{COUNT} assign tick = n[1];"),
    ),
    Accepted(
        "attributes",
        module('(* keep = "yes" *) reg n; (* x *) always @(posedge clk) (* y *) n <= ~n;\nassign tick = n;'),
        "2",
    ),
    # Constructs by how many files have them.
    Accepted(
        "old-style ports",
        "module d (clk, rst, tick);\ninput clk, rst; output tick; reg tick; reg [1:0] n;\n"
        "always @(posedge clk or posedge rst) if (rst) begin n <= 0; tick <= 0; end\n"
        "else if (n >= 2) begin n <= 0; tick <= ~tick; end else n <= n + 1;\nendmodule\n",
        "6",
    ),
    Accepted(
        "asynchronous reset, active low",
        "module d (input clk, rst, output reg tick);\nalways @(posedge clk, negedge rst)\n"
        "if (~rst) tick <= 1'b1; else tick <= ~tick;\nendmodule\n",
        "2",
    ),
    Accepted(
        "negedge blocks",
        module(
            "reg [1:0] n; reg h; always @(posedge clk) n <= n >= 2 ? 0 : n + 1;\n"
            "always @(negedge clk) h <= n == 2; assign tick = n == 2 | h;"
        ),
        "3",
    ),
    Accepted(
        "instances by position, an expression on a port",
        module("wire a, b; stage s (clk & 1'b1, a); stage t (!a, b); assign tick = b ^ 1'b0;") + STAGE,
    ),
    Accepted(
        "an unconnected port",
        module("stage s (.ck(clk), .q()); wire a; stage t (clk, a); stage u (.ck(a), .q(tick));") + STAGE,
    ),
    Accepted(
        "blocking assignment in a clocked block",
        module(
            "reg [2:0] n; reg t; always @(posedge clk) begin n = n + 1; if (n > 4) n = 0; t = n < 2; end\n"
            "assign tick = t;"
        ),
        "5",
        4,
    ),
    Accepted("the clock used as data", module(f"{COUNT} assign tick = clk & n[0] & n[1];"), "4", 1),
    Accepted(
        "a derived clock",
        module(
            "reg a, b; wire g = ~a; always @(posedge clk) a <= ~a; always @(posedge g) b <= ~b; assign tick = b;"
        ),
    ),
    Accepted(
        "$clog2",
        module(
            "localparam N = 6, W = $clog2(N); reg [W-1:0] n;\n"
            "always @(posedge clk) n <= n >= N - 1 ? 0 : n + 1; assign tick = n < N / 2;"
        ),
        "6",
    ),
    Accepted(
        "always_ff", module("reg n; always_ff @(posedge clk) n <= ~n; assign tick = n;"), "2", system=True
    ),
    Accepted(
        "case",
        module(
            "reg [2:0] n; always @(posedge clk) case (n) 3'd0, 3'd1, 3'd2: n <= n + 1; default: n <= 0; endcase\n"
            "assign tick = ~n[1];"
        ),
        "4",
        note="",
    ),
    Accepted(
        "variable bit-select",
        module("reg [1:0] n; wire [3:0] p = 4'b0011;\nalways @(posedge clk) n <= n + 1; assign tick = p[n];"),
    ),
    Accepted(
        "a choice right behind a decimal number",
        module("reg [2:0] n; always @(posedge clk) n <= n >= 3'd5?0:n + 3'd1;\nassign tick = n[2];"),
        "6",
        4,
    ),
    Accepted(
        "1_000",
        module(
            "reg [3:0] n; always @(posedge clk) if (n >= 4'b1_00_1) n <= 0; else n <= n + 1;\n"
            "assign tick = n < 0_5;"
        ),
        "10",
    ),
    Accepted(
        "initial",
        module("reg [1:0] n; initial n = 2'b10; always @(posedge clk) n <= n + 1; assign tick = n[1];"),
    ),
    Accepted(
        "integer",
        module(
            "reg [1:0] n; integer k; always @(posedge clk) begin k = n; k = k - 1;\n"
            "n <= k < 0 ? 2 : k; end assign tick = n == 0;"
        ),
        "3",
        2,
    ),
    Accepted(
        "three edges in one list",
        "module d (input clk, s, r, output reg tick);\nalways @(posedge clk or negedge s or negedge r)\n"
        "if (!s) tick <= 1; else if (!r) tick <= 0; else tick <= ~tick;\nendmodule\n",
        "2",
        holds=(("s", 1), ("r", 1)),
    ),
    Accepted(
        "both edges of one clock",
        module(
            "reg [1:0] n; always @(posedge clk or negedge clk) n <= n == 2 ? 0 : n + 1;\nassign tick = n == 0;"
        ),
        "3/2",
        1,
        note="dual-edge",
        line=2,
    ),
    Accepted(
        "gate primitives",
        module(f"{COUNT} wire a, b; nand g (a, n[0], n[1]); nor (b, n[1], n[0]);\nxor h (tick, a, b);"),
    ),
    Accepted(
        "a latch",
        module(f"{COUNT} reg l; always @* if (!clk) l = n[1]; assign tick = l;"),
        "4",
        note="latch",
        line=2,
    ),
    Accepted(
        "inout used one way",
        "module d (inout clk, inout tick);\nreg n; always @(posedge clk) n <= ~n;\n"
        "assign tick = n;\nendmodule\n",
        "2",
        plain="module d (input clk, output tick);\nreg n; always @(posedge clk) n <= ~n;\n"
        "assign tick = n;\nendmodule\n",
    ),
    Accepted(
        "an implicit net",
        module(f"{COUNT} assign half = n[1]; buf (tick, half);"),
        note="half isn't declared",
        line=2,
    ),
    Accepted(
        "$display and the like",
        module(
            'reg [1:0] n; initial $display("go");\nalways @(posedge clk) begin '
            'n <= n + 1;\n$display("%d at %t", n, $time); $write; end assign tick = n[1];'
        ),
        plain=module(f"{COUNT} assign tick = n[1];"),
        note="only serves simulation",
        line=4,
    ),
    Accepted(
        "delays",
        module(
            "reg [1:0] n; always @(posedge clk) n <= #1 n + 1; wire #2 t = n[1];\nassign #(1, 2) tick = t;"
        ),
        plain=module(f"{COUNT} assign tick = n[1];"),
        note="delay passed over",
        line=2,
    ),
    Accepted(
        "a function",
        module(
            "function [2:0] next; input [2:0] a; begin if (a >= 4) next = 0; else next = a + 1; end endfunction\n"
            "reg [2:0] n; always @(posedge clk) n <= next(n); assign tick = n < 3;"
        ),
        "5",
        6,
    ),
    Accepted(
        "a loop",
        module(
            "reg [3:0] n; integer i; always @(posedge clk) begin\nfor (i = 3; i > 0; i = i - 1) n[i] <= n[i - 1];\n"
            "n[0] <= ~|n[2:0]; end assign tick = n[3];"
        ),
        "4",
        2,
    ),
    Accepted(
        "signed",
        module(
            "reg signed [2:0] n; always @(posedge clk) if (n >= 2) n <= -3; else n <= n + 1;\n"
            "assign tick = n < 0;"
        ),
        "6",
    ),
    Accepted(
        "a task",
        module(
            "reg [1:0] n; reg t; task turn; input [1:0] last; begin if (n >= last) begin n = 0; t = ~t; end\n"
            "else n = n + 1; end endtask always @(posedge clk) turn(2); assign tick = t;"
        ),
        "6",
    ),
]

# -- Verilog-2005 --------------------------------------------------------------------------------------------

VERILOG = [
    Accepted(
        "an output of the port list declared again as reg",
        "module d (input clk, output [1:0] n, output tick);\nreg [1:0] n; reg tick = 0;\n"
        "always @(posedge clk) begin n <= n + 1; tick <= n[1]; end\nendmodule\n",
        note="n is declared again",
        line=2,
    ),
    Accepted(
        "a select beyond the word on the side of a ?: that is not taken",
        module(
            "reg [1:0] n; integer i; always @(posedge clk) for (i = 0; i < 2; i = i + 1)\n"
            "n[i] <= i == 0 ? ~n[1] : n[i - 1]; assign tick = n[1];"
        ),
    ),
    Accepted(
        "a select beyond the word behind an && that is decided",
        module(
            "reg [1:0] n; integer i; always @(posedge clk) for (i = 0; i < 2; i = i + 1)\n"
            "n[i] <= (i > 0 && n[i - 1]) || (i == 0 && !n[1]); assign tick = n[1];"
        ),
    ),
    Accepted(
        "a constant function",
        module(
            "function integer bits; input integer v; begin bits = 0; while (v > 0) begin bits = bits + 1;\n"
            "v = v >> 1; end end endfunction localparam W = bits(5); reg [W-1:0] n;\n"
            "always @(posedge clk) n <= n >= 5 ? 0 : n + 1; assign tick = n < 3;"
        ),
        "6",
    ),
    Accepted(
        "a recursive automatic function",
        module(
            "function automatic [2:0] f(input [2:0] k, input integer d); f = d == 0 ? k : f(k + 1, d - 1);\n"
            "endfunction reg [2:0] n; always @(posedge clk) n <= n >= 4 ? 0 : f(n, 2); assign tick = n < 3;"
        ),
        "3",
        4,
    ),
    Accepted(
        "a task with outputs",
        module(
            "reg [1:0] n; task add; input [1:0] a; output [1:0] b; inout c; begin b = a + 1; if (b == 0) c = ~c; end\n"
            "endtask reg t; always @(posedge clk) begin add(n, n, t); end assign tick = t;"
        ),
        "8",
    ),
    Accepted(
        "a while loop",
        module(
            "reg [2:0] n; integer i; always @(posedge clk) begin i = 0; n = n + 1;\n"
            "while (i < 3) begin if (n == 5 + i) n = 0; i = i + 1; end end assign tick = n < 2;"
        ),
        "5",
        4,
    ),
    Accepted(
        "a repeat loop",
        module(
            "reg [3:0] n; always @(posedge clk) begin repeat (3) n = {n[2:0], ~n[3]}; end assign tick = n[0];"
        ),
        "8",
        wrong=True,
    ),
    Accepted(
        "nested loops with a local variable",
        module(
            "reg [3:0] n; integer i; always @(posedge clk) begin : b reg [3:0] s; integer j; s = 0;\n"
            "for (i = 0; i < 2; i = i + 1) for (j = 0; j <= i; j = j + 1) s = s + i;\n"
            "n <= n >= 5 ? 0 : n + s; end assign tick = n < 2;"
        ),
        "4",
        2,
    ),
    Accepted(
        "generate nested in generate",
        module(
            "wire [3:0] w; genvar i, j; generate for (i = 0; i < 2; i = i + 1) begin : a\n"
            "for (j = 0; j < 2; j = j + 1) begin : b if (i == 1 && j == 1) assign w[3] = n[1];\n"
            f"else assign w[2 * i + j] = 1'b0; end end endgenerate {COUNT} assign tick = |w;"
        ),
    ),
    Accepted(
        "a generate block by its path",
        module(
            "genvar i; for (i = 0; i < 2; i = i + 1) begin : s reg q; end\n"
            "always @(posedge clk) s[0].q <= ~s[0].q; always @(posedge s[0].q) s[1].q <= ~s[1].q;\n"
            "assign tick = s[1].q;"
        ),
    ),
    Accepted(
        "a memory of constants",
        module(
            "reg [1:0] next [0:3]; reg [1:0] n; initial begin next[0] = 1; next[1] = 2; next[2] = 0; next[3] = 0;\n"
            "end always @(posedge clk) n <= next[n]; assign tick = n == 1;"
        ),
        "3",
        2,
    ),
    Accepted(
        "a memory of registers",
        module(
            "reg m [0:3]; reg [1:0] n; always @(posedge clk) begin n <= n + 1; m[n] <= ~m[n]; end\n"
            "assign tick = m[0];"
        ),
        "8",
        plain=module(
            "reg [3:0] m; reg [1:0] n; always @(posedge clk) begin n <= n + 1; m[n] <= ~m[n]; end\n"
            "assign tick = m[0];"
        ),
    ),
    Accepted(
        "a latch with a clear",
        "module d (input clk, c, output tick);\nreg [1:0] n; always @(posedge clk) n <= n + 1; reg l;\n"
        "always @(clk or c or n) if (c) l <= 0; else if (!clk) l <= n[1];\nassign tick = l;\nendmodule\n",
        "4",
        holds=(("c", 0),),
        note="latch",
        line=3,
    ),
    Accepted(
        "positional parameters",
        module("wire [2:0] n; counter #(4) c (clk, n); assign tick = n < 2;") + COUNTER,
        "5",
        4,
    ),
    Accepted(
        "named parameters",
        module("wire [2:0] n; counter #(.LAST(2 + 1)) c (.n(n), .k(clk)); assign tick = n[1];") + COUNTER,
        "4",
    ),
    Accepted(
        "hierarchical instance arrays",
        module("wire [2:0] q; stage u [2:0] ({q[1:0], clk}, q); assign tick = u[2].q;") + STAGE,
        "8",
    ),
    Accepted(
        "an array of gates",
        module(f"{COUNT} wire [1:0] a; not g [1:0] (a, n); and (tick, a[0], a[1]);"),
        "4",
        2,
    ),
    Accepted(
        "tri-state with one driver",
        f"module d (input clk, en, output tick);\n{COUNT} assign tick = en ? n[1] : 1'bz;\nendmodule\n",
        holds=(("en", 1),),
    ),
    Accepted(
        "bufif1",
        f"module d (input clk, en, output tick);\n{COUNT} bufif1 (tick, n[1], en);\nendmodule\n",
        holds=(("en", 1),),
        note="floating",
        line=2,
    ),
    Accepted(
        "$signed and $unsigned",
        module(
            "reg [2:0] n; always @(posedge clk)\n"
            "if ($signed(n) >= 2) n <= 3'b110; else n <= n + 1; assign tick = $signed(n) < 0;"
        ),
        "5",
        4,
    ),
    Accepted(
        "an arithmetic shift",
        module(
            "reg signed [3:0] n; always @(posedge clk) if (n == 0 || n == -1) n <= -8;\n"
            "else n <= n >>> 1; assign tick = n == -8;"
        ),
        "4",
        2,
    ),
    Accepted(
        "specify blocks",
        module(f"{COUNT} assign tick = n[1];\nspecify (clk => tick) = (1, 2); endspecify"),
        note="specify",
        line=3,
    ),
    Accepted(
        "translate_off",
        module(
            f"{COUNT} assign tick = n[1];\n// synthesis translate_off\n"
            "assign tick = n[0];\n// synthesis translate_on"
        ),
        plain=module(f"{COUNT} assign tick = n[1];"),
        note="simulation-only",
        line=3,
    ),
    Accepted(
        "casez",
        module(
            "reg [2:0] n; always @(posedge clk) casez (n) 3'b1??: n <= 0; 3'b0?1: n <= n + 1;\n"
            "default: n <= n | 3'b001; endcase assign tick = n[2];"
        ),
        "5",
        2,
    ),
    Accepted(
        "casex",
        module(
            "reg [1:0] n; always @(posedge clk) casex (n) 2'b1x: n <= 0; default: n <= n + 1; endcase\n"
            "assign tick = n[1];"
        ),
        "3",
        2,
    ),
    Accepted(
        "a decode that clears",
        "module d (input clk, output tick);\nreg [1:0] n; reg c;\n"
        "always @(posedge clk) n <= n + 1; wire z = n == 2;\n"
        "always @(negedge clk or posedge z) if (z) c <= 0; else c <= 1;\nassign tick = c;\nendmodule\n",
        "4",
        5,
        wrong=True,
    ),
    Accepted(
        "several bits of a vector in different blocks",
        module(
            "reg [1:0] q; always @(posedge clk) q[0] <= ~q[0]; always @(negedge q[0]) q[1] <= ~q[1];\n"
            "assign tick = q[1];"
        ),
    ),
    Accepted(
        "a vector that counts down from 1 to 0",
        module("reg [0:1] n; always @(posedge clk) n <= n - 1;\nassign tick = n[0];"),
    ),
    Accepted(
        "indexed part selects",
        module(
            "reg [5:0] r; reg [1:0] n; always @(posedge clk) begin n <= n + 1;\n"
            "r[n +: 2] <= ~r[n +: 2]; end assign tick = r[4 -: 1];"
        ),
        "8",
    ),
    Accepted(
        "a concatenation on the left",
        module("reg [1:0] n; reg c; always @(posedge clk) {c, n} <= n + 3'd1;\nassign tick = c;"),
        "4",
        2,
    ),
    Accepted(
        "replication",
        module("reg [1:0] n; always @(posedge clk) n <= (n + 1) & {2{~&n}}; assign tick = n[1];"),
        "4",
    ),
    Accepted(
        "macros",
        "`define LAST 2'd2\n`define STEP(a, b) a + b\n"
        + module(
            "reg [1:0] n; always @(posedge clk) n <= n >= `LAST ? 0 : `STEP(n, 1); assign tick = n == 0;"
        ),
        "3",
        2,
    ),
    Accepted(
        "`ifdef",
        "`define BY_4\n"
        + module(f"{COUNT}\n`ifdef BY_4\nassign tick = n[1];\n`else\nassign tick = n[0];\n`endif"),
    ),
    Accepted(
        "division and remainder by constants",
        module("reg [2:0] n; always @(posedge clk) n <= (n + 1) % 6;\nassign tick = n / 3 == 0;"),
        "6",
    ),
    Accepted(
        "a gated clock",
        module(
            "reg e; reg q; always @(negedge clk) e <= ~e; wire g = clk & e;\n"
            "always @(posedge g) q <= ~q; assign tick = q;"
        ),
    ),
    Accepted(
        "a real limit with a fraction",
        module(
            "parameter F_IN = 50e3, F_OUT = 9600.0; reg [2:0] n;\n"
            "always @(posedge clk) if (n >= F_IN/F_OUT - 1) n <= 0; else n <= n + 1;\n"
            "assign tick = n < F_IN/(2*F_OUT);"
        ),
        # 5.2 - 1 = 4.2: the count runs from 0 to 5, and is below 2.6 for three cycles.
        "6",
    ),
    Accepted(
        "an integer from reals",
        module(
            "localparam integer N = 57.6e3/9600 - 0.5; reg [2:0] n;\n"
            "always @(posedge clk) if (n >= N - 1) n <= 0; else n <= n + 1; assign tick = n >= N/2;"
        ),
        # 5.5 is a tie and becomes 6.
        "6",
    ),
    Accepted(
        "an instance given reals",
        "module c (input k, output q); parameter real F = 1; parameter [2:0] N = 1; reg [2:0] n;\n"
        "always @(posedge k) n <= n == N ? 0 : n + 1'd1; assign q = n > F; endmodule\n"
        + module("c #(.F(3e6/2e6), .N(2.6)) u (clk, tick);"),
        "4",
    ),
    Accepted(
        "$rtoi of a real",
        module(
            "localparam N = $rtoi(50e6/9.2e6); reg [2:0] n;\n"
            "always @(posedge clk) n <= n == N ? 0 : n + 1; assign tick = n > N / 2;"
        ),
        "6",
    ),
    Accepted(
        "int' of a real",
        module(
            "localparam int N = int'(50e6/9.2e6) + 4'(1.0 > 2.0); reg [2:0] n;\n"
            "always @(posedge clk) n <= n == N ? 0 : n + 1; assign tick = n > N / 2;"
        ),
        "6",
        system=True,
    ),
    Accepted(
        "a generate if of reals",
        module(
            f"parameter F = 27e6; {COUNT} if (F / 2 > 13.4e6) assign tick = n[1]; else assign tick = n[0];"
        ),
    ),
    Accepted(
        "equality with a fraction",
        module(
            "localparam N = 5/2.0; reg [1:0] n;\nalways @(posedge clk)\nif (n == N) n <= 0; else n <= n + 1;\n"
            "assign tick = n[1];"
        ),
        note="never holds: 2.5 is no whole number",
        line=4,
    ),
    Accepted("a real that nothing uses", module(f"parameter real F = 1.5; {COUNT} assign tick = n[1];")),
    Accepted(
        "strings as parameters",
        module(
            'parameter MODE = "HALF"; reg [1:0] n; always @(posedge clk) n <= n + 1;\n'
            'generate if (MODE == "HALF") assign tick = n[0]; else assign tick = n[1]; endgenerate'
        ),
        "2",
    ),
    Accepted(
        "an event at the head of always",
        module("reg n; always begin @(posedge clk); n <= ~n; end assign tick = n;"),
        "2",
    ),
    Accepted(
        "case of 1",
        module(
            "reg [2:0] s; always @(posedge clk) case (1'b1) s[0]: s <= 3'b010; s[1]: s <= 3'b100;\n"
            "default: s <= 3'b001; endcase assign tick = s[1];"
        ),
        "3",
        2,
    ),
    Accepted(
        "a bit of a parameter",
        "module d #(parameter N = 5) (input clk, output tick);\nreg [2:0] p, q;\n"
        "always @(posedge clk) p <= p >= N - 1 ? 0 : p + 1; always @(negedge clk) q <= p;\n"
        "assign tick = N == 1 ? clk : N[0] ? p > N >> 1 | q > N >> 1 : p < N >> 1;\nendmodule\n",
        "5",
    ),
    Accepted(
        "macromodule",
        "macromodule d (input clk, output reg tick);\nalways @(posedge clk) tick <= ~tick;\nendmodule\n",
        "2",
    ),
    Accepted(
        "escaped names",
        module("reg n; wire \\n+1 = ~n; always @(posedge clk) n <= \\n+1 ; assign tick = \\n ;"),
        "2",
    ),
]

# -- SystemVerilog -------------------------------------------------------------------------------------------

ASSERTED = """\
module d (input clk, output logic tick);
  logic [1:0] n;
  property wrap; @(posedge clk) n == 2 |=> n == 0; endproperty : wrap
  sequence start; n == 0 ##1 n == 1; endsequence
  wraps: assert property (wrap) else $error("no wrap at %0d", n);
  assume property (@(posedge clk) !$isunknown(n));
  cover property (@(posedge clk) start);
  always_ff @(posedge clk) begin
    assert (n < 3) else $error("lost");
    if (n >= 2) begin n <= 0; tick <= ~tick; end else n <= n + 1;
    case (n)
      0: assert (n != 3);
      default: assert (1'b1) $display("fine"); else $error("odd");
    endcase
  end
endmodule
"""
UNASSERTED = """\
module d (input clk, output reg tick);
  reg [1:0] n;
  always @(posedge clk) if (n >= 2) begin n <= 0; tick <= ~tick; end else n <= n + 1;
endmodule
"""

SYSTEM = [
    Accepted("assertions", ASSERTED, "6", plain=UNASSERTED, note="assertion passed over", line=3),
    Accepted(
        "a task named assert",
        module(
            "reg [1:0] n; wire cover = n == 2; task assert; input wrap; n <= wrap ? 0 : n + 1; endtask\n"
            "always @(posedge clk) assert(cover); assign tick = n == 1;"
        ),
        "3",
        2,
    ),
    Accepted(
        "logic driven by assign and by a process",
        module(
            "logic t; logic [1:0] n; always_ff @(posedge clk) n <= n + 1; assign t = n[1]; assign tick = t;"
        ),
        system=True,
    ),
    Accepted(
        "always_comb",
        module(
            "logic [1:0] n, m; always_comb begin m = n; if (n == 2) m = '0; else m += 1; end\n"
            "always_ff @(posedge clk) n <= m; assign tick = n == 0;"
        ),
        "3",
        2,
        system=True,
    ),
    Accepted(
        "always_latch",
        module(f"{COUNT} logic l; always_latch if (!clk) l <= n[1]; assign tick = l;"),
        system=True,
    ),
    Accepted(
        "an enum without a typedef",
        module(
            "enum logic [1:0] {A, B, C} s; always_ff @(posedge clk) case (s) A: s <= B;\n"
            "B: s <= C; default: s <= A; endcase assign tick = s == B;"
        ),
        "3",
        2,
        system=True,
    ),
    Accepted(
        "a typedef of a vector",
        module(
            "typedef logic [2:0] word; word n; always_ff @(posedge clk)\n"
            "if (n >= word'(4)) n <= 0; else n <= n + 1; assign tick = n < 2;"
        ),
        "5",
        4,
        system=True,
    ),
    Accepted(
        "+=, -= and their kin",
        module(
            "logic [2:0] n; always @(posedge clk) begin n += 3; n -= 2; n &= 3'b011;\n"
            "n <<= 1; n >>= 1; n ^= 0; n |= 0; n *= 1; end assign tick = n[1];"
        ),
        system=True,
    ),
    Accepted(
        "int in a for loop",
        module(
            "logic [3:0] n; always_ff @(posedge clk) begin\n"
            "for (int i = 1; i < 4; i++) n[i] <= n[i - 1]; n[0] <= ~n[3]; end assign tick = n[0];"
        ),
        "8",
        system=True,
        wrong=True,
    ),
    Accepted(
        "unique case",
        module(
            "logic [1:0] n; always_ff @(posedge clk) unique case (n) 0: n <= 1; 1: n <= 2;\n"
            "default: n <= 0; endcase assign tick = n == 2;"
        ),
        "3",
        2,
        system=True,
        plain=module(
            "reg [1:0] n; always @(posedge clk) case (n) 0: n <= 1; 1: n <= 2;\n"
            "default: n <= 0; endcase assign tick = n == 2;"
        ),
    ),
    Accepted(
        "a named port without its net",
        module("wire ck = clk, q; stage u (.ck, .q); assign tick = q;") + STAGE,
        "2",
        plain=module("stage u (clk, tick);") + STAGE,
    ),
    Accepted(
        "input and output logic",
        "module d (input logic clk, output logic tick);\n"
        "always_ff @(posedge clk) tick <= ~tick;\nendmodule : d\n",
        "2",
        system=True,
    ),
    Accepted(
        "return",
        module(
            "function automatic logic [2:0] f(input logic [2:0] a);\nif (a >= 4) return 0;\n"
            "return a + 1; endfunction logic [2:0] n; always_ff @(posedge clk) n <= f(n); assign tick = n < 2;"
        ),
        "5",
        4,
        system=True,
    ),
    Accepted(
        "a void function",
        module(
            "logic [1:0] n; function void t(); n = n + 1; endfunction\n"
            "always @(posedge clk) t(); assign tick = n[1];"
        ),
        system=True,
        plain=module("reg [1:0] n; always @(posedge clk) n = n + 1; assign tick = n[1];"),
    ),
]

# -- refused -------------------------------------------------------------------------------------------------

RESET = "module d (input clk, rst, x, output reg tick);\n"


def clocked(events: str, body: str) -> str:
    return f"{RESET}always @({events})\n{body}\nendmodule\n"


REFUSED = [
    Refused("two drivers", module("assign tick = clk;\nassign tick = ~clk;"), "tick driven twice d.v:2", 3),
    Refused(
        "two drivers of one bit of a vector",
        module("wire [2:0] w; assign w[1:0] = 2; assign tick = w[0];\nassign w[2:1] = 1;"),
        "w[1] driven twice",
        3,
    ),
    Refused(
        "a gate and an assignment", module("assign tick = clk;\nnot (tick, clk);"), "tick driven twice", 3
    ),
    Refused(
        "a register assigned in two always blocks",
        module(
            "reg n; always @(posedge clk) n <= ~n;\nalways @(posedge clk) if (n) n <= 0;\nassign tick = n;"
        ),
        "n assigned two always blocks d.v:2",
        3,
    ),
    Refused(
        "= and <= on one register",
        clocked("posedge clk", "begin tick = 1; tick <= x; end"),
        "tick both = and <=",
        3,
    ),
    Refused(
        "= and <= on one register in two branches",
        clocked("posedge clk", "if (x) tick = 1; else\ntick <= ~tick;"),
        "tick both = and <=",
        4,
    ),
    Refused(
        "a signal sampled by the edge it makes",
        clocked("posedge clk", "tick <= clk;"),
        "sampled by the edge it makes simulator gates",
        2,
    ),
    Refused(
        "a derived signal sampled by the edge it makes",
        module(
            "reg a, b; wire g = !a; always @(posedge clk) a <= ~a;\nalways @(posedge g) b <= a ^ b;\n"
            "assign tick = b;"
        ),
        "b samples a signal that clocks it",
        3,
    ),
    Refused(
        "a reset that rises by the list and is tested low",
        clocked("posedge clk or posedge rst", "if (!rst) tick <= 0; else tick <= ~tick;"),
        "posedge rst simulator sample gates reset negedge",
        2,
    ),
    Refused(
        "a reset that falls by the list and is tested high",
        clocked("posedge clk or negedge rst", "if (rst) tick <= 0; else tick <= ~tick;"),
        "negedge rst simulator sample gates reset posedge",
        2,
    ),
    Refused(
        "edge and level in one sensitivity list",
        clocked("posedge clk or rst", "if (rst) tick <= 0; else tick <= ~tick;"),
        "edges and levels simulator",
        2,
    ),
    Refused(
        "two clocks", clocked("posedge clk or posedge x", "tick <= ~tick;"), "edges of both clk and x", 2
    ),
    Refused(
        "both edges of two signals",
        clocked("posedge clk or negedge clk or posedge x or negedge x", "tick <= ~tick;"),
        "no flip-flop",
        2,
    ),
    Refused(
        "a clear under a further condition",
        clocked("posedge clk or posedge rst", "if (rst) begin if (x) tick <= 0; end else tick <= ~tick;"),
        "further condition simulator edges gates",
        2,
    ),
    Refused(
        "an incomplete sensitivity list", clocked("x", "tick = x & rst;"), "sensitivity list lacks rst", 2
    ),
    Refused(
        "a latch in always_comb", f"{RESET}always_comb\nif (clk) tick = x;\nendmodule\n", "tick every path", 3
    ),
    Refused(
        "an input declared reg",
        "module d (input reg clk, output tick);\nendmodule\n",
        "input declared reg",
        1,
    ),
    Refused("a missing module", module("level_filter u (clk, tick);"), "level_filter defined", 2),
    Refused(
        "a port declared twice",
        "module d (clk, tick);\ninput clk; output tick;\ninput clk;\nendmodule\n",
        "clk declared twice",
        3,
    ),
    Refused(
        "a wire assigned in a process",
        "module d (input clk, output tick);\nalways @(posedge clk)\ntick <= ~tick;\nendmodule\n",
        "tick wire",
        3,
    ),
    Refused("a reg driven by assign", f"{RESET}assign tick = x;\nendmodule\n", "tick reg", 2),
    Refused("an input that is driven", module("assign clk = 0;\nassign tick = 0;"), "clk input", 2),
    Refused(
        "a net that floats",
        f"{RESET}wire e;\nalways @(posedge clk) tick <= e;\nendmodule\n",
        "e never driven",
        2,
    ),
    Refused("a missing name", module("assign tick = LAST;"), "LAST declared", 2),
    Refused(
        "a name under `default_nettype none",
        "`default_nettype none\nmodule d (input wire clk, output wire tick);\n"
        "assign half = clk;\nassign tick = half;\nendmodule\n",
        "half declared default_nettype",
        3,
    ),
    Refused(
        "a loop that can't be unrolled",
        clocked("posedge clk", "begin : b integer i; for (i = 0; i < x; i = i + 1)\ntick <= ~tick; end"),
        "how often loop",
        3,
    ),
    Refused(
        "an endless loop",
        clocked("posedge clk", "begin : b integer i; for (i = 0; i < 2; i = i)\ntick <= ~tick; end"),
        "loop never ends",
        3,
    ),
    Refused(
        "a delay in a clocked block",
        clocked("posedge clk", "#1 tick <= ~tick;"),
        "delay before a statement",
        3,
    ),
    Refused("an always block of delays", f"{RESET}always\n#5 tick = ~tick;\nendmodule\n", "always delay", 2),
    Refused(
        "an event in the middle",
        clocked("posedge clk", "begin tick <= 1; @(posedge clk)\ntick <= 0; end"),
        "event inside a process",
        3,
    ),
    Refused("wait", clocked("posedge clk", "wait (x) tick <= 1;"), "wait", 3),
    Refused("fork", clocked("posedge clk", "fork tick <= 1; join"), "fork", 3),
    Refused("disable", clocked("posedge clk", "begin : b disable b; end"), "disable", 3),
    Refused("force", clocked("posedge clk", "force tick = 1;"), "force", 3),
    Refused(
        "assign inside a process", clocked("posedge clk", "assign tick = 1;"), "assign inside a process", 3
    ),
    Refused("$random", clocked("posedge clk", "tick <= $random;"), "$random", 3),
    Refused(
        "$readmemh", f'{RESET}reg [3:0] m [0:3];\ninitial $readmemh("m.hex", m);\nendmodule\n', "$readmemh", 3
    ),
    Refused("a real", f"{RESET}real r;\nendmodule\n", "real", 2),
    Refused("a bit of a real", module("parameter F = 2.5;\nassign tick = F[0];"), "F is a real number", 3),
    Refused("a remainder of reals", module("assign tick =\n7.5 % 2;"), "real number", 3),
    Refused("a shift of a real", module("parameter F = 2.5;\nassign tick = F << 1;"), "real number", 3),
    Refused("a real inside a concatenation", module("assign tick =\n{1'b0, 2.0};"), "real number", 3),
    Refused("=== of a real", module("assign tick =\nclk === 1.0;"), "===", 3),
    Refused("a real as a bound", module("parameter N = 8.0;\nreg [N-1:0] n;"), "bound real 7.0", 3),
    Refused(
        "a real that is too large", module("localparam integer N = 3e9;\nassign tick = N;"), "32 bits", 2
    ),
    Refused("a real division by zero", module("localparam N = 1.0/0;\nassign tick = N > 1;"), "zero", 2),
    Refused("a real that varies", module("assign tick =\nclk * 0.5 > 0;"), "beside a real", 3),
    Refused(
        "a sum that overflows beside a real",
        module("localparam N = 50_000_000 * 100 + 0.5;\nassign tick = N > 1;"),
        "overflows 32 bits",
        2,
    ),
    Refused(
        "an initial value that isn't constant",
        f"{RESET}initial\ntick = x;\nendmodule\n",
        "initial constant",
        3,
    ),
    Refused(
        "wired logic with two drivers",
        module("assign tick = clk;\nassign tick = 0;", "input clk, output wor tick"),
        "tick driven twice",
        3,
    ),
    Refused("tran", module("tran (tick, clk);"), "tran", 2),
    Refused("pullup", module("pullup (tick);"), "pullup", 2),
    Refused("strengths", module("assign (strong1, weak0) tick = clk;"), "strong1", 2),
    Refused(
        "two dimensions", module("reg [1:0] m [0:1][0:1]; assign tick = 0;"), "more than one dimension", 2
    ),
    Refused("two packed dimensions", module("logic [1:0][1:0] m; assign tick = 0;"), "packed dimension", 2),
    Refused("a struct", module("struct packed {logic a;} s;"), "packed", 2),
    Refused(
        "an interface",
        "interface plug;\nendinterface\n" + module("assign tick = clk;"),
        "interface outside",
        1,
    ),
    Refused("a package", "package rates;\nendpackage\n" + module("assign tick = clk;"), "package outside", 1),
    Refused("inside", module("assign tick = clk inside {0};"), "inside", 2),
    Refused(
        "an assignment pattern", clocked("posedge clk", "tick <= '{default: 0};"), "assignment pattern", 3
    ),
    Refused("an assertion that acts", clocked("posedge clk", "assert (x) tick <= ~tick;"), "tick", 3),
    Refused(
        "a reversed part select", module("wire [3:0] w = 0; assign tick = ^w[0:1];"), "w[0:1] runs against", 2
    ),
    Refused("an index out of range", module("wire [3:0] w = 0; assign tick = w[4];"), "outside w[3:0]", 2),
    Refused("a replication of nothing", module("assign tick = {0{clk}};"), "replication 0", 2),
    Refused("a number of no bits", module("assign tick = 0'd1;"), "0'd1", 2),
    Refused(
        "two initial values",
        f"{RESET}initial tick = 0;\ninitial tick = 1;\nendmodule\n",
        "tick two different initial values",
        3,
    ),
    Refused(
        "a function that calls itself",
        module("function f(input a); f = f(a); endfunction\nassign tick = f(clk);"),
        "f automatic",
        2,
    ),
    Refused("a defparam of nothing", module("defparam u.N = 1;\nassign tick = clk;"), "defparam", 2),
    Refused("a path to nowhere", module("assign tick = u.q;"), "u no block", 2),
]
