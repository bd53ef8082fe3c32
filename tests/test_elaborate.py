"""Modules to registers: hierarchy, processes, drivers, and what is refused where simulation and gates differ."""

from __future__ import annotations

from pathlib import Path

import pytest

from prover.design import Design
from prover.errors import UserError
from prover.expr import evaluate
from prover.verilog import read_design


def read(tmp_path: Path, text: str, **options: object) -> Design:
    path = tmp_path / "m.v"
    path.write_text(text)
    return read_design([path], **options)  # type: ignore[arg-type]


def machine(tmp_path: Path, body: str, ports: str = "input clk, rst, set, d, e, output reg q") -> str:
    """The registers of a module as text, without its ports."""
    lines = str(read(tmp_path, f"module m({ports});\n{body}\nendmodule\n")).splitlines()
    return "\n".join(line for line in lines if not line.startswith(("design", "input", "output")))


# -- edge-triggered blocks ---------------------------------------------------------------------------------

CLEAR = "flip-flop q 1\n  force rst to 1'd0\n  rise clk takes d"


@pytest.mark.parametrize(
    "body",
    [
        "always @(posedge clk or posedge rst) if (rst) q <= 0; else q <= d;",
        "always @(posedge clk, posedge rst) if (rst == 1'b1) q <= 1'b0; else q <= d;",
        "always @(posedge rst or posedge clk) if (!rst) q <= d; else q <= 0;",
        "always @(posedge clk or posedge rst) begin : b if (rst == 1) begin q <= 0; end else begin q <= d; end end",
        "always @(posedge clk or posedge rst) q <= rst ? 1'b0 : d;",
        "always @(posedge clk or posedge rst) q <= d & ~rst;",
        "always @(posedge clk or posedge rst) case (rst) 1: q <= 0; default: q <= d; endcase",
        "always @(posedge(clk) or posedge (rst)) if (rst !== 1'b0) q = 0; else q = d;",
        "wire n = ~rst; always @(posedge clk or negedge n) if (!n) q <= 0; else q <= d;",
        "always @(posedge clk or posedge rst) begin q <= d; if (rst) q <= 0; end",
        "reg t; always @(posedge clk or posedge rst) begin t = d; if (rst) q <= 0; else q <= t; end",
        "always_ff @(posedge clk or posedge rst) if (rst) q <= '0; else q <= d;",
    ],
)
def test_every_form_of_an_asynchronous_clear(tmp_path: Path, body: str) -> None:
    assert machine(tmp_path, body) == CLEAR


def test_set_and_clear_in_order_of_precedence(tmp_path: Path) -> None:
    body = "always @(posedge clk or posedge rst or negedge set) if (rst) q <= 0; else if (!set) q <= 1; else q <= d;"
    assert machine(tmp_path, body) == (
        "flip-flop q 1\n  force rst to 1'd0\n  force (bvnot set) to 1'd1\n  rise clk takes d"
    )


def test_a_register_that_reset_leaves_alone_holds_meanwhile(tmp_path: Path) -> None:
    body = "reg p; always @(posedge clk or posedge rst) if (rst) q <= 0; else begin q <= d; p <= e; end"
    assert machine(tmp_path, body).endswith("flip-flop p 1\n  rise clk takes (ite rst p e)")


def test_reset_of_some_bits_parts_the_register(tmp_path: Path) -> None:
    body = "always @(posedge clk or posedge rst) if (rst) q[1:0] <= 2; else q <= {4{d}};"
    found = machine(tmp_path, body, "input clk, rst, d, output reg [3:0] q")
    assert "flip-flop q[1:0] 2\n  force rst to 2'd2" in found
    assert "flip-flop q[3:2] 2\n  rise clk takes (ite rst q[3:2] " in found


def test_a_further_condition_beside_the_reset_is_synchronous(tmp_path: Path) -> None:
    body = "always @(posedge clk or posedge rst) if (rst || e) q <= 0; else q <= d;"
    assert machine(tmp_path, body) == "flip-flop q 1\n  force rst to 1'd0\n  rise clk takes (ite e 1'd0 d)"


def test_both_edges_of_one_clock(tmp_path: Path) -> None:
    body = "always @(posedge clk or negedge clk) q <= clk ? d : e;"
    assert machine(tmp_path, body) == "flip-flop q 1\n  rise clk takes d\n  rise (bvnot clk) takes e"


def test_a_clear_whose_branches_come_to_the_same(tmp_path: Path) -> None:
    body = "parameter ON = 0; always @(posedge clk or posedge rst) if (rst) q <= 0; else q <= ON && d;"
    assert machine(tmp_path, body) == "flip-flop q 1\n  force rst to 1'd0\n  rise clk takes 1'd0"


def test_ripple_stages_of_one_vector(tmp_path: Path) -> None:
    body = "always @(posedge clk) q[0] <= ~q[0]; always @(negedge q[0]) q[1] <= ~q[1];"
    assert machine(tmp_path, body, "input clk, output reg [1:0] q") == (
        "flip-flop q[0] 1\n  rise clk takes (bvnot q[0])\nflip-flop q[1] 1\n  rise (bvnot q[0]) takes (bvnot q[1])"
    )


def test_a_decode_clears_its_own_counter(tmp_path: Path) -> None:
    text = (
        "module ff(input c, r_n, output reg q); always @(negedge c or negedge r_n) if (!r_n) q <= 0; else q <= ~q;\n"
        "endmodule module m(input clk, output out); wire a, b, r; nand (r, a, b); ff x(clk, r, a), y(a, r, b);\n"
        "assign out = b; endmodule"
    )
    assert str(read(tmp_path, text)) == (
        "design m\ninput clk 1\n"
        "flip-flop x.q 1\n  force (bvand x.q y.q) to 1'd0\n  rise (bvnot clk) takes (bvnot x.q)\n"
        "flip-flop y.q 1\n  force (bvand x.q y.q) to 1'd0\n  rise (bvnot x.q) takes (bvnot y.q)\n"
        "output out = y.q\n"
    )


@pytest.mark.parametrize(
    ("body", "message"),
    [
        ("always @(posedge clk or posedge rst) if (!rst) q <= 0; else q <= ~q;", "write negedge rst"),
        ("always @(posedge clk or negedge rst) if (rst) q <= 0; else q <= d;", "write posedge rst"),
        ("always @(posedge clk or posedge rst) q <= d;", "edges of both clk and rst"),
        (
            "always @(posedge clk or posedge rst) begin if (rst) q <= 0; else q <= d; p <= d; end reg p;",
            "p takes its",
        ),
        ("always @(posedge clk or posedge e) if (e) q <= ~q; else q <= d;", "q moves on"),
        (
            "always @(posedge clk or posedge rst) if (rst) begin if (e) q <= 0; end else q <= d;",
            "further condition",
        ),
        ("always @(posedge clk or rst) if (rst) q <= 0; else q <= d;", "edges and levels in one list"),
        ("always @(posedge clk) q <= clk;", "sampled by the edge it makes"),
        ("wire n = !clk; always @(posedge clk) q <= n;", "samples clk"),
        ("always @(posedge clk or posedge rst) q <= clk & rst;", "isn't plain"),
        ("always @(posedge v) q <= d; wire [1:0] v = {clk, d};", "an edge of 2 bits"),
        ("wire one = 1; always @(posedge clk) q <= d; always @(posedge 1'b1) q <= 0;", "never comes"),
        (
            "always @(posedge clk) q <= d; always @(posedge clk) if (e) q <= 0;",
            "assigned in two always blocks",
        ),
        ("always @(posedge clk) begin q = d; q <= e; end", "both = and <="),
        ("always @(e) q = d & e;", "the sensitivity list lacks d"),
        ("always @(d) q = q ^ d;", "the sensitivity list lacks q"),
        ("always_comb if (e) q = d;", "isn't assigned on every path"),
        ("always_ff @(posedge clk or rst) q <= d;", "needs edges only"),
        ("always_comb @(d) q = d;", "takes no sensitivity list"),
        ("always @(posedge clk) d <= e;", "d is"),
        ("wire w; always @(posedge clk) w <= e;", "w is a wire"),
        ("assign q = d;", "q is a reg"),
        ("wire w; assign w = d; assign w = e;", "w is driven twice"),
        ("wire [3:0] w; assign w[2:0] = d; assign w[3:2] = e;", "w[2] is driven twice"),
        ("initial q = d;", "must be constant"),
        ("wire w; initial w = 0;", "w is a wire"),
        ("initial q = 0; initial q = 1;", "two different initial values"),
        ("integer n; always @(posedge clk) for (n = 0; n < d; n = n + 1) q <= e;", "isn't known beforehand"),
        ("always @(posedge clk) q <= nowhere; wire nowhere;", "nowhere is never driven"),
        ("reg never; always @(posedge clk) q <= never;", "never is never assigned"),
        (
            "k u(.c(clk)); endmodule module k(input c, d); reg p; always @(posedge c) p <= d;",
            "u.d is never driven",
        ),
        ("task t; #1 q = 0; endtask always @(posedge clk) t;", "delay before a statement"),
        ("function f(input x); f = d; endfunction always @(posedge clk) q <= f(d, e);", "takes 1 arguments"),
        (
            "function f(input x); f = f(x); endfunction always @(posedge clk) q <= f(d);",
            "declare it automatic",
        ),
    ],
)
def test_refusal(tmp_path: Path, body: str, message: str) -> None:
    with pytest.raises(UserError) as caught:
        machine(tmp_path, body)
    assert message in f"{caught.value.message} {caught.value.hint}"
    assert caught.value.where is not None
    assert caught.value.where.line == 2


def test_two_drivers_are_both_named(tmp_path: Path) -> None:
    with pytest.raises(UserError, match=r"here and at .*m\.v:3") as caught:
        machine(tmp_path, "always @(posedge clk)\n q <= d;\nalways @(posedge clk)\n q <= e;")
    assert caught.value.where is not None
    assert caught.value.where.line == 5


# -- combinational blocks, latches, loops ------------------------------------------------------------------


@pytest.mark.parametrize(
    ("body", "expected"),
    [
        ("always @* if (e) q = d;", "latch q 1\n  force e to d"),
        ("always @(e or d) if (!e) q <= d;", "latch q 1\n  force (bvnot e) to d"),
        ("always_latch if (e && rst) q = d;", "latch q 1\n  force (bvand e rst) to d"),
        ("always @* case (e) 1: q = d; endcase", "latch q 1\n  force e to d"),
        ("always @* begin q = 0; if (e) q = d; end", ""),
        ("wire w = w & e | d; always @(posedge clk) q <= w;",
         "flip-flop q 1\n  rise clk takes w\nloop w 1\n  force 1'd1 to (bvor (bvand w e) d)"),
        ("wire [2:0] w = {w[1:0], d}; always @(posedge clk) q <= w[2];", "flip-flop q 1\n  rise clk takes d"),
        ("integer i; always @* for (i = 0; i < 3; i = i + 1) if (i == 1) q = d;", ""),
        ("reg [3:0] t; always @* begin t[3] = d; t[2] = t[3] ^ e; t[1:0] = 0; q = t[2]; end", ""),
    ],
)  # fmt: skip
def test_levels(tmp_path: Path, body: str, expected: str) -> None:
    assert machine(tmp_path, body) == expected


def test_latches_of_some_bits(tmp_path: Path) -> None:
    body = "always @* begin q = 0; q[0] = d; end always @* begin p[1] = d; if (d) p[0] = clk; end"
    found = machine(tmp_path, body, "input clk, d, output reg [1:0] q, p")
    assert found == "latch p[0] 1\n  force d to clk"
    notes = read(tmp_path, f"module m(input clk, d, output reg [1:0] q, p); {body} endmodule").notes
    assert [note.message for note in notes] == ["p[0] is a latch: not every path assigns it"]


def test_cross_coupled_gates(tmp_path: Path) -> None:
    text = "module m(input s, r, output q); wire p; nor #1 (q, r, p), (p, s, q); endmodule"
    design = read(tmp_path, text)
    assert [(r.kind, r.name) for r in design.registers] == [("loop", "q")]
    assert any("combinational loop: q -> p -> q" in note.message for note in design.notes)


def test_values_in_between_are_no_registers(tmp_path: Path) -> None:
    body = (
        "reg [3:0] t; integer i; reg kept;\n"
        "always @(posedge clk) begin t = {4{d}}; for (i = 0; i < 4; i = i + 1) t[i] = t[i] ^ e;\n"
        "  q <= ^t; kept = d; end\n"
        "assign o = kept;"
    )
    found = machine(tmp_path, body, "input clk, d, e, output reg q, output o")
    assert [line.split()[1] for line in found.splitlines() if line.startswith("flip-flop")] == ["q", "kept"]


def test_a_value_read_by_another_block_at_the_same_edge_is_noted(tmp_path: Path) -> None:
    blocks = "always @(posedge clk) t = ~t; always @(posedge clk) q <= t;"
    text = f"module m(input clk, output reg q); reg t; {blocks} endmodule"
    notes = [note.message for note in read(tmp_path, text).notes]
    assert any("t is assigned with = and read at the same edge" in note for note in notes)


# -- hierarchy ---------------------------------------------------------------------------------------------

COUNTER = (
    "module c #(parameter W = 2, S = 1) (input k, output reg [W-1:0] n); always @(posedge k) n <= n + S;\n"
    "endmodule\n"
)


@pytest.mark.parametrize(
    ("instance", "width", "step"),
    [
        ("c u(clk, y)", 2, 1),
        ("c #(3) u(clk, y)", 3, 1),
        ("c #(3, 2) u(.n(y), .k(clk))", 3, 2),
        ("c #(.S(3)) u(.n(y), .k(clk))", 2, 3),
        ("c u(clk, y); defparam u.W = 4, u.S = 5", 4, 5),
        ("if (1) begin : g c u(clk, y); end defparam g.u.S = 3", 2, 3),
    ],
)
def test_parameters_reach_instances(tmp_path: Path, instance: str, width: int, step: int) -> None:
    design = read(tmp_path, COUNTER + f"module m(input clk, output [7:0] y); {instance}; endmodule")
    (register,) = design.registers
    assert register.width == width
    assert evaluate([register.edges[0].data], {register.name: 0}) == [step % (1 << width)]


def test_parameters_of_the_top(tmp_path: Path) -> None:
    design = read(tmp_path, COUNTER, parameters={"W": 5})
    assert design.parameters == {"W": 5, "S": 1}
    assert design.registers[0].width == 5
    with pytest.raises(UserError, match="no parameter X") as caught:
        read(tmp_path, COUNTER, parameters={"X": 5})
    assert "W, S" in caught.value.hint


def test_generated_ripple_chain_with_initial_values(tmp_path: Path) -> None:
    text = (
        "module ff #(parameter I = 0) (input c, output reg q = I); always @(negedge c) q <= ~q; endmodule\n"
        "module m #(parameter N = 3) (input clk, output y); wire [N:0] c; assign c[0] = clk, y = c[N]; genvar i;\n"
        "generate for (i = 0; i < N; i = i + 1) begin : s ff #(i == 1) u(c[i], c[i + 1]); end endgenerate endmodule"
    )
    design = read(tmp_path, text)
    assert [(r.name, r.initial, str(r.edges[0].clock)) for r in design.registers] == [
        ("s[0].u.q", 0, "(bvnot clk)"),
        ("s[1].u.q", 1, "(bvnot s[0].u.q)"),
        ("s[2].u.q", 0, "(bvnot s[1].u.q)"),
    ]


def test_arrays_of_instances(tmp_path: Path) -> None:
    text = (
        "module ff(input c, d, output reg q); always @(posedge c) q <= d; endmodule\n"
        "module m(input clk, output [2:0] y); ff u[2:0](clk, {y[1:0], ~y[2]}, y); endmodule"
    )
    design = read(tmp_path, text)
    assert [str(r.edges[0].data) for r in design.registers] == ["(bvnot u[2].q)", "u[0].q", "u[1].q"]


def test_ports_that_go_both_ways_by_name_only(tmp_path: Path) -> None:
    text = (
        "module k(inout a, b); assign b = ~a; endmodule module m(input clk, output y); k u(clk, y); endmodule"
    )
    assert str(read(tmp_path, text)).splitlines()[-1] == "output y = (bvnot clk)"
    text = "module m(input clk, e, inout y); assign y = e ? clk : 1'bz; endmodule"
    design = read(tmp_path, text)
    assert design.outputs == ("y",)
    assert str(design.signals["y"].value) == "(ite e clk ?1)"


def test_names_down_the_hierarchy(tmp_path: Path) -> None:
    design = read(
        tmp_path, COUNTER + "module m(input clk, output y); c u(clk,); assign y = u.n[1]; endmodule"
    )
    assert str(design.signals["y"].value) == "(extract u.n 1 1)"


def test_user_defined_primitives(tmp_path: Path) -> None:
    text = (
        "primitive f(q, c, d, r); output q; reg q; input c, d, r; initial q = 1; table\n"
        "// c d r : q : next\n"
        "  r 0 0 : ? : 0; r 1 0 : ? : 1; f ? 0 : ? : -; ? * 0 : ? : -; ? ? 1 : ? : 0; ? ? f : ? : -;\n"
        "endtable endprimitive\n"
        "primitive g(o, a, b); output o; input a, b; table 0 ? : 0; ? 0 : 0; 1 1 : 1; endtable endprimitive\n"
        "module m(input clk, rst, e, output y); wire d; f u(y, clk, d, rst); g v(d, e, e); endmodule"
    )
    (register,) = read(tmp_path, text).registers
    assert (register.name, register.initial, len(register.edges)) == ("y", 1, 1)
    assert [str(f.when) for f in register.forces] == ["rst"]
    for e in (0, 1):
        for rst in (0, 1):
            values = {"clk": 1, "rst": rst, "e": e, "y": 0}
            values |= {f"?{i}": 1 for i in range(20)}
            assert evaluate([register.edges[0].data], values) == [0 if rst else e]


def test_the_top_is_what_no_other_module_holds(tmp_path: Path) -> None:
    two = COUNTER + "module a(input x); endmodule module b(input x); endmodule\n"
    with pytest.raises(UserError, match="c, a, b") as caught:
        read(tmp_path, two)
    assert "--module" in caught.value.hint
    assert read(tmp_path, two, module="b").top == "b"
    with pytest.raises(UserError, match="isn't defined"):
        read(tmp_path, two, module="none")


def test_silent_parts_are_noted_and_passed_over(tmp_path: Path) -> None:
    text = (
        'module m(input clk, output reg q);\n  initial q = 0;\n  initial $display("%d", q);\n'
        "  always @(posedge clk) begin q <= #1 ~q; $write(q); end\n  specify (clk => q) = 1; endspecify\nendmodule"
    )
    design = read(tmp_path, text)
    assert sorted(note.where.line for note in design.notes) == [3, 4, 4, 5]
    assert machine_of(design) == "flip-flop q 1 initial 0\n  rise clk takes (bvnot q)"


def machine_of(design: Design) -> str:
    return "\n".join(line for line in str(design).splitlines() if line.startswith(("flip-flop", "  ")))


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("module m(input c); m u(c); endmodule", "no module with ports|nest more than"),
        ("module m(input c); k u(c); endmodule module k(input c); m u(c); endmodule", "no module with ports"),
        ("module m(input c); genvar i; for (i = 0; i < 1 << 30; i = i + 1) wire w; endmodule", "more than 10000"),
        ("module m(input c); k u[9999999:0](c); endmodule module k(input c); endmodule", "more than 10000"),
        ("module m(input c, output reg q); integer i;\nalways @(posedge c)\nfor (i = 0; i < 9999; i = i + 1) q <= 1;"
         "endmodule", "runs more than"),
        ("module m(input c, output reg q); integer i, j; always @(posedge c) for (i = 0; i < 9999; i = i + 1) "
         "for (j = 0; j < 999; j = j + 1) q <= i; endmodule", "unrolling takes more"),
        ("module m(input c, output q); function automatic integer f(input integer x); f = x < 2 ? x : f(x - 1) + "
         "f(x - 2); endfunction localparam P = f(60); assign q = P; endmodule", "unrolling takes more"),
        ("module m(input c, output q); function automatic f(input x); f = f(x); endfunction\n assign q = f(c);\n"
         "endmodule", "without end"),
        ("module m(input c);" + "if (1) begin " * 2000 + "end " * 2000 + "endmodule", "nest more than"),
        ("module m(input c, output q); wire [9:0] w; assign w = 1, q = w[1 << 20]; endmodule", "outside w"),
    ],
)  # fmt: skip
def test_endless_sources_end(tmp_path: Path, text: str, message: str) -> None:
    with pytest.raises(UserError, match=message):
        read(tmp_path, text)
