"""The grammar: what pyverilog refuses or misreads, read right; the tables that are shipped; syntax errors."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

from prover.errors import UserError
from prover.expr import evaluate
from prover.verilog import read_design
from prover.verilog.grammar import Grammar
from prover.verilog.parse import TABLES, make_tables, render

HEAD = "module m(input clk, input [7:0] a, input [7:0] b, output [7:0] y);\n"


def value(tmp_path: Path, body: str, a: int = 0, b: int = 0, name: str = "y") -> int:
    """What the output is for two inputs; the body stands inside a module with inputs a, b and output y."""
    path = tmp_path / "m.v"
    path.write_text(HEAD + body + "\nendmodule\n")
    return evaluate([read_design([path]).signals[name].value], {"a": a, "b": b, "clk": 0})[0]


def refused(tmp_path: Path, text: str) -> UserError:
    path = tmp_path / "m.v"
    path.write_text(text)
    with pytest.raises(UserError) as caught:
        read_design([path])
    assert caught.value.where is not None
    return caught.value


def test_shipped_tables_are_those_of_the_grammar() -> None:
    assert TABLES.read_text(encoding="ascii") == render(make_tables(Grammar()))


def test_reading_writes_nothing(tmp_path: Path) -> None:
    (tmp_path / "m.v").write_text(HEAD + "assign y = a; endmodule")
    command = "from prover.verilog import read_design; read_design(['m.v'])"
    subprocess.run(
        [sys.executable, "-B", "-c", command], cwd=tmp_path, check=True, env={"PYTHONPATH": _root()}
    )
    assert [p.name for p in tmp_path.iterdir()] == ["m.v"]


def _root() -> str:
    return str(Path(__file__).parent.parent)


# Every row is a trap of pyverilog 1.3.0: refused there although plain, or read as something else.
@pytest.mark.parametrize(
    ("body", "a", "b", "expected"),
    [
        ("assign y = a[5 -: 4];", 0b00101100, 0, 0b1011),
        ("assign y = a[2 +: 4];", 0b00101100, 0, 0b1011),
        ("wire [7:0] p = a, q = b; assign y = p ^ q;", 6, 3, 5),
        ("assign y = 4 'd3;", 0, 0, 3),
        ("assign y = 8'h 1_F;", 0, 0, 0x1F),
        ("assign y = 8 'b 1010;", 0, 0, 10),
        ("wire [7:0] p; nand #1 g(p[0], a[0], b[0]); nand #(1,2) (p[1], a[1], b[1]); assign y = p[1:0];", 1, 3, 2),
        ("reg [7:0] p; always @* case (a) 1: p = 2; default p = 7; endcase assign y = p;", 5, 0, 7),
        ("reg [7:0] p; always @* begin ; if (a) p = 1; else ; p = b; ; end assign y = p;", 1, 9, 9),
        ("assign y = ^~a;", 0b11, 0, 1),
        ("assign y = ~^a;", 0b111, 0, 0),
        ("assign y = a ^~ b & 8'h0f;", 0xF0, 0x3C, 0xFF ^ 0xF0 ^ 0x0C),
        ("assign y = a ? b ? 1 : 2 : 3;", 1, 0, 2),
        ("assign y = a ? 1 : b ? 2 : 3;", 0, 1, 2),
        ("assign y = a + 1 ? 2 : 3;", 255, 0, 2),
        ("assign y = 0 ? 9 : a + b;", 2, 3, 5),
        ("assign y = -a ** 2;", 3, 0, None),
        ("localparam P = -3; assign y = -P ** 3;", 0, 0, 27),
        ("assign y = 2 ** 3 ** 2;", 0, 0, 64),
        ("assign y = a - b - 1;", 9, 3, 5),
        ("assign y = a | b & 8'h0f;", 0x80, 0xF3, 0x83),
        ("assign y = a < 3 == b;", 2, 1, 1),
        ("assign y = !a == b;", 0, 1, 1),
        ("assign y = {2{a[1:0], b[0]}};", 2, 1, 0b101101),
        ("assign y = {{2{a[0]}}, {b[1:0], 1'b1}};", 1, 2, 0b11101),
        ("assign y = a & &b;", 1, 255, 1),
        ("assign y = a && &b;", 4, 255, 1),
        ("assign y = a<=b;", 3, 3, 1),
        ("assign y = - 8'sd5;", 0, 0, 251),
        ("wire \\a+b ; assign \\a+b = a[0]; assign y = \\a+b ;", 1, 0, 1),
        ("wire \\p ; assign p = a[0]; assign y = \\p ;", 1, 0, 1),
        ("(* keep = \"*)\" *) wire [7:0] p; (* x, y = 2 *) assign p = a; assign y = p;", 5, 0, 5),
        ("tri [7:0] p; wand [7:0] q; assign p = a; assign q = b; assign y = p + q;", 5, 2, 7),
        ("supply1 one; supply0 zero; assign y = {one, zero};", 0, 0, 2),
        ("function [7:0] f(input [7:0] x, z); f = x - z; endfunction assign y = f(a, b);", 7, 2, 5),
        ("function [7:0] f; input [7:0] x; input [7:0] z; begin f = x; f = f - z; end endfunction "
         "assign y = f(a, b);", 7, 2, 5),
        ("reg [7:0] p; task t(input [7:0] x, output [7:0] z); z = x + 1; endtask always @* t(a, p); assign y = p;",
         7, 0, 8),
        ("reg [7:0] p; task t; p = a; endtask always @* t; assign y = p;", 7, 0, 7),
        ("if (1) assign y = a; else assign y = b;", 7, 1, 7),
        ("generate if (0) begin assign y = a; end else begin : g assign y = b; end endgenerate", 7, 1, 1),
        ("for (genvar i = 0; i < 8; i++) begin : g assign y[i] = a[7 - i]; end", 1, 0, 128),
        ("genvar i; for (i = 0; i < 8; i = i + 1) assign y[i] = ~a[i];", 1, 0, 254),
        ("case (3) 1, 2: assign y = a; default: assign y = b; endcase", 1, 9, 9),
        ("reg [7:0] p; integer i; always @* begin p = 0; for (i = 0; i < 4; i = i + 1) p = p + i; end assign y = p;",
         0, 0, 6),
        ("reg [7:0] p; integer i; always @* begin p = a; repeat (3) p = p + 1; i = 0; "
         "while (i < 2) begin i = i + 1; p = p * 2; end end assign y = p;", 1, 0, 16),
        ("logic [7:0] p; always_comb begin p = '0; p[0] = 1'b1; p += a; p <<= 1; p++; end assign y = p;", 2, 0, 7),
        ("assign y = '1;", 0, 0, 255),
        ('assign y = "A" + "\\n";', 0, 0, 65 + 10),
        ('localparam S = "HALF"; generate if (S == "HALF") assign y = a; endgenerate', 7, 0, 7),
        ("function automatic int f(input [7:0] p); for (int i = 0; i < 8; i++) if (p[i]) return i; return 8; "
         "endfunction assign y = f(a);", 0b101000, 0, 3),
        ("logic [7:0] p; function void t(input [7:0] q); if (q == 3) return; p = q; endfunction "
         "always_comb begin p = 9; t(a); end assign y = p;", 3, 0, 9),
        ("reg [7:0] p; always begin @(a or b); p = a; p = p + b; end assign y = p;", 3, 4, 7),
        ("assign y = 4'(a) + 8'(b);", 0xF5, 3, 8),
        ("typedef enum logic [1:0] {A, B = 2, C} t; t s; assign s = C; assign y = {s, B};", 0, 0, 0b1110),
        ("localparam int N = 3; localparam logic [1:0] M = 7; assign y = N * 4 + M;", 0, 0, 15),
        ("reg bit; always @* bit = a[0]; assign y = bit;", 1, 0, 1),
        ("wire int = a[0]; assign y = int;", 1, 0, 1),
        ("specify (a => y) = 1; endspecify assign y = a;", 4, 0, 4),
        ("assign y = $unsigned(a) + $signed(b) + $clog2(9);", 1, 2, 7),
        ("wire signed [3:0] p = a[3:0], q = b[3:0]; assign y = p < q;", 0xF, 1, 1),
        ("reg [7:0] p; always @(a or b) begin : blk reg [7:0] t; t = a; p = t + b; end assign y = p;", 1, 2, 3),
        ("defparam u.K = 5; k u(y); endmodule module k(output [7:0] o); parameter K = 1; assign o = K;", 0, 0, 5),
        ("wire [7:0] o; k u(.*); assign y = o; endmodule\nmodule k(input [7:0] a, b, output [7:0] o);\n"
         "assign o = a - b;", 9, 2, 7),
        ("k u(.a, .b(b), .o(y)); endmodule module k(input [7:0] a, b, output [7:0] o); assign o = a - b;", 9, 2, 7),
    ],
)  # fmt: skip
def test_reading(tmp_path: Path, body: str, a: int, b: int, expected: int | None) -> None:
    if expected is None:
        assert "**" in refused(tmp_path, HEAD + body + "endmodule").message
    else:
        assert value(tmp_path, body, a, b) == expected


def test_signed_holds_for_all_names_of_a_declaration(tmp_path: Path) -> None:
    path = tmp_path / "m.v"
    path.write_text(
        "module m(p, q, s, t);\n input signed [3:0] p, q;\n output reg signed [3:0] s, t;\nendmodule\n"
        "module n(input signed [3:0] a, b, input [3:0] c, d, output reg signed [1:0] e = -1, f = 1, output g);\n"
        " assign g = 0;\nendmodule\n"
    )
    with pytest.raises(UserError, match="never assigned"):
        read_design([path], module="m")
    design = read_design([path], module="n")
    assert {n: s.signed for n, s in design.signals.items()} == {
        "a": True, "b": True, "c": False, "d": False, "e": True, "f": True, "g": False,
    }  # fmt: skip
    assert [(r.name, r.width, r.initial) for r in design.registers] == [("e", 2, 3), ("f", 2, 1)]


def test_initial_values_in_declarations(tmp_path: Path) -> None:
    path = tmp_path / "m.v"
    path.write_text(
        "module m(input clk, output reg q = 0, output y);\n reg a = 1, b = 0; reg [3:0] c = 4'd9, d;\n"
        " integer i = -1;\n"
        " always @(posedge clk) begin q <= ~q; a <= b; b <= a; c <= d; d <= c + i; i <= i; end\n"
        " assign y = a;\nendmodule"
    )
    found = {r.name: r.initial for r in read_design([path]).registers}
    assert found == {"q": 0, "a": 1, "b": 0, "c": 9, "d": None, "i": 2**32 - 1}


@pytest.mark.parametrize(
    ("body", "message"),
    [
        ("always #5 x = 1;", "a delay at its head"),
        ("reg x; always begin x = 1; end", "no event at its head"),
        ("real r;", "real isn't supported"),
        ("assign y = 1.5 % 2;", "real number"),
        ("assign y = 1.5 2.5;", "syntax error"),
        ("assign y = a &&& b;", "&&&"),
        ("assign y = 4'd3 'd4;", "syntax error"),
        ("assign y = 2'b12;", "digit '2'"),
        ("assign y = 8'd1F;", "no decimal number"),
        ("assign y = 3'bz_;", None),
        ("assign y = $random;", "random"),
        ("assign y = nothing;", "isn't declared"),
        ("reg [7:0] p; always @(posedge clk) fork p <= 1; join", "fork"),
        ("reg [7:0] p; always @(posedge clk) assign p = 1;", "assign inside a process"),
        ("reg [7:0] p; always @(posedge clk) force p = 1;", "force"),
        ("reg [7:0] p; always @(posedge clk) begin : n disable n; end", "disable"),
        ("reg [7:0] p; always @(posedge clk) begin #1 p <= 1; end", "delay before a statement"),
        ("reg [7:0] p; always @(posedge clk) p <= @(posedge a) b;", "event inside an assignment"),
        ("pullup (y);", "pullup isn't supported"),
        ("struct packed { logic p; } s;", "packed isn't supported"),
        ("begin : n assign y = a; end : k", "ends as k"),
        ("input z;", "isn't in the module's port list"),
        ("wire [7:0] a;", "declared twice"),
        ("wire w; wire w;", "declared twice"),
        ("localparam L;", "has no value"),
        ("localparam L = K, K = L; assign y = L;", "defined by itself"),
        ("genvar i; for (i = 0; i < 2; i = i) begin : g end", "never ends"),
        ("k u(1); endmodule module k(input p); endmodule module k(input q); ", "defined twice"),
    ],
)
def test_refusal(tmp_path: Path, body: str, message: str | None) -> None:
    path = tmp_path / "m.v"
    path.write_text(HEAD + body + "\nendmodule\n")
    if message is None:
        assert read_design([path]).outputs == ("y",)
        return
    with pytest.raises(UserError, match=message.replace("(", r"\(").replace("*", r"\*")) as caught:
        read_design([path])
    assert caught.value.where is not None
    assert caught.value.where.line == 2


@pytest.mark.parametrize(
    ("header", "message"),
    [
        ("module m(input reg a, output y);", "can't be declared reg"),
        ("module m(a, y); input a; reg a; output y;", "can't be declared reg"),
        ("module m(inout reg a, output y);", "can't be declared reg"),
        ("module m(a, a, y); input a; output y;", "listed twice"),
        ("module m(input a, input a, output y);", "declared twice"),
        ("module m(a, y); input a; input a; output y;", "declared twice"),
        ("module m(a, y); input a; output y; reg y; reg y;", "declared twice"),
        ("module m(a, y); input a; output [3:0] y; reg y;", "give both the same range"),
        ("module m(a, y); input a; output reg y; wire y;", "declared twice"),
        ("module m(input a, output wire y); reg y;", "write output reg y there"),
        ("module m(input a, output y); reg [1:0] y;", "give both the same range"),
        ("module m(a, y); input a;", "has no direction"),
        ("module m(input output a, output y);", "one direction"),
        ("module m(input a, output y [1:0]);", "can't be a memory"),
        ("module m(input a, output y,);", "syntax error"),
        ("module m(.p(a), output y);", "syntax error"),
        ("module (input a);", "without a name"),
        ("module m(a, input b, output y);", "has no direction"),
    ],
)
def test_bad_ports(tmp_path: Path, header: str, message: str) -> None:
    error = refused(tmp_path, header + "\nendmodule\n")
    assert message in f"{error.message} {error.hint}"


def test_a_syntax_error_points_at_the_token(tmp_path: Path) -> None:
    error = refused(tmp_path, "module m(input clk);\n  wire w = clk + * 3;\nendmodule\n")
    assert error.where is not None
    assert (error.where.line, error.where.column) == (2, 18)
    assert str(error).splitlines()[2] == "    " + " " * 17 + "^"


def test_a_bench_in_the_same_file_is_left_aside_unread(tmp_path: Path) -> None:
    path = tmp_path / "m.v"
    path.write_text(
        "module m(input clk, output reg q); always @(posedge clk) q <= ~q; endmodule\n"
        "module tb; reg clk = 0; always #5 clk = ~clk; m u(clk, q); event e; initial begin fork join_any -> e; end\n"
        "endmodule\n"
    )
    design = read_design([path])
    assert design.top == "m"
    assert any("test bench" in note.message for note in design.notes)


def test_deep_nesting_is_no_recursion(tmp_path: Path) -> None:
    many = 10_000
    assert value(tmp_path, "assign y = " + " + ".join(["a"] * many) + ";", 1) == many % 256
    assert value(tmp_path, "assign y = " + "(" * many + "a" + ")" * many + ";", 3) == 3
    assert value(tmp_path, "assign y = " + "~" * many + "a;", 3) == 3
    chain = "".join(f"a == {i} ? {i} : " for i in range(250)) * 12
    assert value(tmp_path, f"assign y = {chain} 0;", 77) == 77
    ifs = "".join(f"if (a == {i % 250}) p = {i % 200}; else " for i in range(2000))
    assert value(tmp_path, f"reg [7:0] p; always @* {ifs} p = 1; assign y = p;", 77) == 77
    blocks = "begin " * many + "p = a;" + " end" * many
    assert value(tmp_path, f"reg [7:0] p; always @* {blocks} assign y = p;", 77) == 77
