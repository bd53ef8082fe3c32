"""Literals, parts of words and the remarks on them. Clauses are those of IEEE 1364-2005.

What a simulator has to say about widths and signs is in agreement/test_sizing_agreement.py.
"""

from __future__ import annotations

from pathlib import Path

import pytest

from prover.design import Design
from prover.errors import UserError
from prover.expr import evaluate, variables
from prover.verilog import read_design
from prover.verilog.parts import literal


def design(tmp_path: Path, body: str, width: int = 8) -> Design:
    path = tmp_path / "m.v"
    path.write_text(
        f"module m(input clk, input [7:0] a, input [3:0] i, input signed [3:0] s, output [{width - 1}:0] y);\n"
        f"{body}\nendmodule\n"
    )
    return read_design([path])


def outcomes(made: Design, **inputs: int) -> set[int]:
    """Values of y over a few settings of the choices."""
    value = made.signals["y"].value
    names = [v.name for v in variables([value]) if v.name.startswith("?")]
    settings = [dict.fromkeys(names, c) for c in (0, -1 & (1 << 64) - 1, 0x55, 0xAA)]
    return {evaluate([value], {"clk": 0, "a": 0, "i": 0, "s": 0} | inputs | c)[0] for c in settings}


@pytest.mark.parametrize(
    ("text", "bits", "x", "z", "width", "signed"),
    [
        ("7", 7, 0, 0, 32, True),
        ("4294967295", 2**32 - 1, 0, 0, 33, True),
        ("1_000", 1000, 0, 0, 32, True),
        ("4'b1x0z", 0b1000, 0b0100, 0b0001, 4, False),
        ("8'hx", 0, 0xFF, 0, 8, False),
        ("8'bx1", 1, 0xFE, 0, 8, False),
        ("8'b1x", 2, 1, 0, 8, False),
        ("4'sd9", 9, 0, 0, 4, True),
        ("'o17", 15, 0, 0, 32, False),
        ("'sd3", 3, 0, 0, 32, True),
        ("12'hz4", 4, 0, 0xFF0, 12, False),
        ("3'd?", 0, 0, 7, 3, False),
        ("16'hdead", 0xDEAD, 0, 0, 16, False),
        ("2'd7", 3, 0, 0, 2, False),
        ("36'h9_0000_0000", 9 << 32, 0, 0, 36, False),
    ],
)
def test_literal(text: str, bits: int, x: int, z: int, width: int, signed: bool) -> None:
    found = literal(text)
    assert (found.bits, found.x, found.z, *found.type) == (bits, x, z, width, signed), "clause 3.5.1"


@pytest.mark.parametrize("text", ["0'd1", "4'd1x", "2'b2", "8'o9", "'d_", "70000'd1"])
def test_bad_literal(text: str) -> None:
    with pytest.raises(ValueError, match=r"\w"):
        literal(text)


def test_x_without_size_fills_its_context(tmp_path: Path) -> None:
    assert {0, 2**40 - 1} <= outcomes(design(tmp_path, "assign y = 'bx;", 40))
    assert all(v >> 4 == 0 for v in outcomes(design(tmp_path, "assign y = 4'bx;", 40)))


@pytest.mark.parametrize(("msb", "lsb"), [(7, 0), (0, 7), (9, 2), (-3, 4), (12, 5)])
def test_variable_index_of_any_range(tmp_path: Path, msb: int, lsb: int) -> None:
    body = f"wire [{msb}:{lsb}] v; assign v = a; assign y = v[s];"
    made = design(tmp_path, body, 1)
    for index in range(-8, 8):
        position = index - lsb if msb >= lsb else lsb - index
        found = outcomes(made, a=0b10110010, s=index & 15)
        expected = {0b10110010 >> position & 1} if 0 <= position < 8 else {0, 1}
        assert found == expected, f"clause 5.2.1: [{msb}:{lsb}] at {index}"


@pytest.mark.parametrize(("msb", "lsb"), [(7, 0), (0, 7), (10, 3)])
@pytest.mark.parametrize("sign", ["+:", "-:"])
def test_indexed_part(tmp_path: Path, msb: int, lsb: int, sign: str) -> None:
    made = design(tmp_path, f"wire [{msb}:{lsb}] v; assign v = a; assign y = v[i {sign} 3];", 3)
    bits = 0b10110010
    for base in range(16):
        # Clause 5.2.1: +: goes up from the base and -: down; the part reads from its msb as declared.
        indices = range(base, base + 3) if sign == "+:" else range(base - 2, base + 1)
        positions = sorted(k - lsb if msb >= lsb else lsb - k for k in indices)
        found = outcomes(made, a=bits, i=base)
        for k, position in enumerate(positions):
            seen = {v >> k & 1 for v in found}
            assert seen == ({bits >> position & 1} if 0 <= position < 8 else {0, 1}), (base, k)


@pytest.mark.parametrize("width", [1, 3])
def test_variable_write_drops_what_lies_outside(tmp_path: Path, width: int) -> None:
    part = "s" if width == 1 else "s +: 3"
    body = f"reg [5:0] v; always @* begin v = a; v[{part}] = ~{width}'d0; end assign y = v;"
    made = design(tmp_path, body, 6)
    for index in range(-8, 8):
        expected = 0
        for k in range(index, index + width):
            expected |= 1 << k if 0 <= k < 6 else 0
        assert outcomes(made, a=0, s=index & 15) == {expected}, "clause 5.2.1"


def test_memory_words(tmp_path: Path) -> None:
    body = (
        "reg [7:0] t [2:5]; initial begin t[2] = 8'h11; t[3] = 8'h22; t[4] = 8'h44; t[5] = 8'h88; end\n"
        "assign y = t[i];"
    )
    made = design(tmp_path, body)
    assert not made.registers
    for index in range(16):
        found = outcomes(made, i=index)
        assert found == {0x11 << index - 2} if 2 <= index <= 5 else {0, 255} <= found
    made = design(tmp_path, "reg [3:0] t [0:2]; always @(posedge clk) t[i][s] <= a[0]; assign y = t[1];", 4)
    assert [(r.name, r.width) for r in made.registers] == [("t[0]", 4), ("t[1]", 4), ("t[2]", 4)]
    data = made.registers[1].edges[0].data
    values = {"a": 1, "i": 1, "s": 2, "t[0]": 0, "t[1]": 0, "t[2]": 0}
    assert evaluate([data], values) == [4]
    assert evaluate([data], values | {"i": 3}) == [0]
    assert evaluate([data], values | {"s": 9}) == [0]


@pytest.mark.parametrize(
    ("base", "power", "expected"),
    # Clause 5.1.5, table 5-6; 0 to a negative power is x.
    [
        (2, 10, 1024),
        (0, 0, 1),
        (5, 0, 1),
        (1, -4, 1),
        (-1, -3, -1),
        (-1, -2, 1),
        (7, -1, 0),
        (-2, 3, -8),
        (0, -1, None),
    ],
)
def test_power_of_constants(tmp_path: Path, base: int, power: int, expected: int | None) -> None:
    found = outcomes(design(tmp_path, f"assign y = ({base}) ** ({power});", 32))
    assert found == {expected & 2**32 - 1} if expected is not None else len(found) > 1


@pytest.mark.parametrize(
    ("number", "expected"), [(0, 0), (1, 0), (2, 1), (3, 2), (4, 2), (5, 3), (256, 8), (257, 9)]
)
def test_clog2(tmp_path: Path, number: int, expected: int) -> None:
    assert outcomes(design(tmp_path, f"assign y = $clog2({number});")) == {expected}, "clause 17.11.1"


@pytest.mark.parametrize(
    ("body", "values"),
    [
        # The wild cards of clause 9.5.1, label by label.
        (
            "casez (a) 8'b1???_????: p = 1; 8'b01zz_zzzz: p = 2; default: p = 3; endcase",
            {0x80: 1, 0x7F: 2, 0x3F: 3},
        ),
        (
            "casex (a) 8'b1xxx_xxxx: p = 1; 8'b0000_000?: p = 2; default: p = 3; endcase",
            {0xFF: 1, 1: 2, 2: 3},
        ),
        ("case (a) 8'b1xxx_xxxx: p = 1; 8'h80: p = 2; default: p = 3; endcase", {0x80: 2, 0xFF: 3}),
        ("casez (a) 8'b1xxx_xxxx: p = 1; default: p = 3; endcase", {0x80: 3}),
        ("case (1'b1) a[0]: p = 1; a[1]: p = 2; default: p = 3; endcase", {1: 1, 2: 2, 3: 1, 4: 3}),
        ("case (a) 3, 5: p = 1; 5: p = 2; default: p = 3; endcase", {3: 1, 5: 1, 6: 3}),
        ("case (s) -1: p = 1; default: p = 3; endcase", {0: 3}),
    ],
)
def test_case(tmp_path: Path, body: str, values: dict[int, int]) -> None:
    made = design(tmp_path, f"reg [7:0] p; always @* {body}\nassign y = p;")
    for a, expected in values.items():
        assert outcomes(made, a=a) == {expected}


def test_division_by_zero_is_any_value_and_nothing_else_is(tmp_path: Path) -> None:
    made = design(tmp_path, "assign y = a / i;")
    assert {0, 255} <= outcomes(made, a=9, i=0)
    assert outcomes(made, a=9, i=2) == {4}


@pytest.mark.parametrize(
    ("body", "message"),
    [
        (
            "reg [2:0] p; always @(posedge clk) p <= 8; assign y = p;",
            "constant 8 is cut to 3 bits and becomes 0",
        ),
        ("assign y = 3'd9;", "3'd9 doesn't fit its size and becomes 1"),
        ("assign y = a == 300;", "never holds"),
        ("assign y = i > 15;", "never holds"),
        ("assign y = i >= 0;", "always holds"),
        ("assign y = s == 9;", "never holds"),
        ("assign y = a === 8'b1x;", "never holds"),
        ("reg p; always @* case (i) 20: p = 1; default: p = 0; endcase assign y = p;", "label 20 is out of"),
        ("k u(a); endmodule module k(input [3:0] p);", "has 4 bits and meets 8: cut"),
        ("k u(i); endmodule module k(input [5:0] p);", "has 6 bits and meets 4: extended"),
        ("assign undeclared = a[0];", "becomes a wire of one bit"),
        ("parameter [3:0] P = 20; wire [3:0] p = P;", "cut to 4 bits"),
    ],
)
def test_remark(tmp_path: Path, body: str, message: str) -> None:
    text = body if "assign y" in body else "assign y = 0; " + body
    notes = [note.message for note in design(tmp_path, text).notes]
    assert any(message in note for note in notes), notes


@pytest.mark.parametrize(
    "body",
    [
        "reg [2:0] p; always @(posedge clk) p <= -1; assign y = p;",
        "reg [2:0] p; always @(posedge clk) p <= 7; assign y = p;",
        "reg [2:0] p; always @(posedge clk) p <= p + 1; assign y = p;",
        "assign y = i < 15 && i > 0 && i != 15 && s < 7;",
        "localparam P = 5; assign y = P > 3;",
    ],
)
def test_no_remark_where_nothing_is_odd(tmp_path: Path, body: str) -> None:
    assert not design(tmp_path, body).notes


@pytest.mark.parametrize(
    ("body", "message"),
    [
        ("assign y = a[8];", "outside a"),
        ("assign y = a[8:1];", "outside a"),
        ("assign y = a[0:3];", "runs against its declaration"),
        ("assign y = a[7 +: 2];", "outside a"),
        ("assign y = a[i:0];", "must be a known constant"),
        ("assign y = a[0 +: i];", "must be a known constant"),
        ("assign y = a[0][0];", "no further part"),
        ("assign y = {a, 3};", "without a size"),
        ("assign y = {0{a}};", "replication of 0"),
        ("assign y = {i{a}};", "must be a known constant"),
        ("assign y = a ** 3;", "constant"),
        ("assign y = $clog2(a);", "must be a known constant"),
        ("reg [7:0] t [0:3]; assign y = t;", "word by word"),
        ("wire [i:0] w; assign y = w;", "isn't constant"),
        ("assign y = {65537{1'b1}};", "replication"),
        ("wire [100000:0] w; assign y = w;", "a vector of 100001 bits"),
        ("assign y = clk ? m : 0;", "isn't declared"),
        ("localparam P = 2; assign y = P; assign P = 3;", "parameter can't be assigned"),
    ],
)
def test_refusal(tmp_path: Path, body: str, message: str) -> None:
    with pytest.raises(UserError, match=message) as caught:
        design(tmp_path, body)
    assert caught.value.where is not None
    assert caught.value.where.line == 2


@pytest.mark.parametrize(
    ("text", "value"), [("35.7", 36), ("35.5", 36), ("-1.5", -2), ("1.5", 2), ("0.49999999999999994", 0)]
)
def test_a_real_is_rounded_where_it_is_assigned(tmp_path: Path, text: str, value: int) -> None:
    """The examples of clause 4.8.2, ties away from zero, and the double next below a half."""
    assert outcomes(design(tmp_path, f"assign y = {text};")) == {value & 255}
    assert outcomes(design(tmp_path, f"localparam signed [7:0] P = {text}; assign y = P;")) == {value & 255}


@pytest.mark.parametrize("text", ["a < 6.5", "6.5 > a", "a <= 6.5", "!(a > 6.5)", "!(6.5 <= a)", "a <= 6.0"])
def test_a_limit_with_a_fraction_divides_the_counts(tmp_path: Path, text: str) -> None:
    made = design(tmp_path, f"assign y = {text};", 1)
    assert [outcomes(made, a=a) for a in (0, 6, 7, 255)] == [{1}, {1}, {0}, {0}], "clause 5.1.7"


def test_a_count_is_never_a_fraction(tmp_path: Path) -> None:
    made = design(tmp_path, "parameter N = 50e6/9600; assign y = a == N;", 1)
    assert outcomes(made, a=208) == {0}
    assert "never holds" in str(made.notes[0])


def test_a_parameter_takes_its_own_type(tmp_path: Path) -> None:
    path = tmp_path / "m.v"
    path.write_text(
        "module m #(parameter real F = 27, parameter integer N = F/2, parameter V = 2.5, parameter [3:0] R = 2.5)\n"
        "(input clk, output [7:0] y); assign y = V * 2; endmodule\n"
    )
    made = read_design([path])
    # A fraction has no place among whole numbers; V is given its override's type (clause 12.2).
    assert made.parameters == {"F": 27, "N": 14, "R": 3}
    assert outcomes(made) == {5}
    made = read_design([path], parameters={"F": 8, "V": 3})
    assert made.parameters == {"F": 8, "N": 4, "V": 3, "R": 3}
    assert outcomes(made) == {6}


@pytest.mark.parametrize(
    ("body", "message"),
    [
        ("assign y = 255.5;", "doesn't fit 8 bits"),
        ("assign y = 1e999 > 1;", "too large"),
        ("assign y = 1e308 * 10 > 1;", "too large"),
        ("assign y = 10.0 ** 400 > 1;", "too large"),
        ("assign y = (-2.0) ** 0.5 > 1;", "no value"),
        ("assign y = 0.0 ** 0 > 1;", "no value"),
        ("assign y = 64'd9007199254740993 + 0.5 > 1;", "no exact real"),
        ("assign y = $rtoi(3e9);", "32 bits"),
        ("assign y = $itor(2.5);", "itor takes"),
        ("assign y = $rtoi(1.5, 2);", "one argument"),
        ("assign y = $clog2(8.5);", "real number 8.5"),
        ("assign y = a[1.0];", "real number"),
        ("assign y = {2.0{a}};", "real number 2.0"),
        ("assign y = ~1.5;", "real number"),
        ("assign y = 2 ** 0.5 | 1;", "real number"),
        ("assign y = (a[0] ? 1.5 : 2.5);", "known constant"),
        ("assign y = {8{a}} < 1.5;", "64 bits"),
        ("parameter signed P = 2.5; assign y = P;", "range"),
        ("reg r; always @* case (a) 1.0: r = 1; default: r = 0; endcase", "real number"),
        ("wire [7:0] #1.5 w = a; real v; assign y = w;", "real isn't supported"),
    ],
)
def test_a_real_that_is_refused(tmp_path: Path, body: str, message: str) -> None:
    with pytest.raises(UserError, match=message) as caught:
        design(tmp_path, body)
    assert caught.value.where is not None
    assert caught.value.hint
