"""Widths and signs of expressions against an event simulator: a table of published rows, and random ones."""

from __future__ import annotations

import random
import subprocess
from pathlib import Path

import pytest

from prover.expr import evaluate, variables
from prover.verilog import read_design

INPUTS = {
    "u1": (1, False), "u3": (3, False), "u4": (4, False), "u8": (8, False), "s3": (3, True), "s4": (4, True),
    "s8": (8, True), "w33": (33, False), "t20": (20, True),
}  # fmt: skip
VECTORS = 10

# Values by Icarus 11.0; clauses of IEEE 1364-2005. The names stand for a4 = 15, b4 = 1, s4 = -3, u2 = 2.
TABLE = [
    ("4.5.2/5.4.2", 4, "(4'd15+4'd1)>>1", 0),
    ("5.4.2", 4, "(4'd15+4'd1+0)>>1", 8),
    ("5.4.1", 8, "a4+b4", 16),
    ("5.1.14", 8, "{a4+b4}", 0),
    ("5.4.1", 8, "~4'd15", 0b11110000),
    ("5.4.1", 8, "-4'd1", 255),
    ("5.4.1", 1, "a4+b4==4'd0", 1),
    ("5.4.1", 1, "a4+b4==5'd16", 1),
    ("5.5.1", 1, "s4 < 2", 1),
    ("5.5.1", 1, "s4 < u2", 0),
    ("5.5.3", 8, "s4", 253),
    ("5.5.3", 8, "s4[3:0]", 13),
    ("5.5.3", 8, "s4 + u4", 15),
    ("5.1.12", 4, "s4>>>1", 0b1110),
    ("5.5.2", 4, "(s4>>>1)|4'd0", 0b0110),
    ("5.1.6", 32, "-12/3", 2**32 - 4),
    ("5.1.6", 32, "-'d12/3", 1431655761),
    ("5.1.6", 32, "-'sd12/3", 2**32 - 4),
    ("5.1.5", 32, "-7/2", 2**32 - 3),
    ("5.1.5", 32, "-7%2", 2**32 - 1),
    ("5.1.5", 32, "7%-2", 1),
    ("5.1.8", 1, "2'b1x==2'b0x", 0),
    ("5.1.13", 1, "1'bx ? 1'b1 : 1'b1", 1),
    ("5.1.12", 4, "a4<<4", 0),
    ("5.1.11", 1, "&4'b0x11", 0),
    ("5.1.11", 1, "|4'b0x01", 1),
    ("5.1.9", 1, "!4'b0x01", 0),
    ("5.1.9", 1, "1'bx && 1'b0", 0),
    ("5.1.9", 1, "1'bx || 1'b1", 1),
    ("5.1.10", 1, "1'b0 & 1'bx", 0),
    ("5.1.10", 1, "1'b1 | 1'bx", 1),
    ("5.1.5", 32, "2**-1", 0),
    ("5.1.5", 32, "0**0", 1),
]
# Rows whose value is x: the reading must leave every value open.
OPEN = [
    ("5.1.5", 4, "a4/4'd0"), ("5.1.5", 4, "a4%4'd0"), ("5.1.10", 1, "1'b1 & 1'bx"), ("5.1.10", 1, "1'b0 | 1'bx"),
    ("5.1.10", 1, "1'b1 ^ 1'bx"), ("5.1.10", 1, "~1'bx"), ("5.1.8", 1, "1'bx == 1'b1"), ("5.2.1", 1, "a4[idx]"),
    ("5.1.11", 1, "^4'b0x01"), ("5.1.9", 1, "!4'b0x00"), ("5.1.9", 1, "1'bx && 1'b1"),
    ("3.5.1", 16, "16'bx"), ("3.5.1", 8, "8'hx"),
]  # fmt: skip


def _outcomes(tmp_path: Path, width: int, text: str) -> set[int]:
    """Every value that the reading allows, choices set to all zeros, all ones and something else."""
    source = tmp_path / "row.v"
    source.write_text(
        f"module row(input clk, output [{width - 1}:0] y);\n"
        "  wire [3:0] a4 = 15, b4 = 1, u4 = 2; wire [1:0] u2 = 2; wire [2:0] idx = 5;\n"
        f"  wire signed [3:0] s4 = -3;\n  assign y = {text};\nendmodule\n"
    )
    value = read_design([source]).signals["y"].value
    names = [v.name for v in variables([value])]
    assert all(name.startswith("?") for name in names)
    return {evaluate([value], dict.fromkeys(names, v))[0] for v in (0, -1 & (1 << 64) - 1, 0x5A5A)}


@pytest.mark.parametrize(("clause", "width", "text", "expected"), TABLE)
def test_published_row(tmp_path: Path, clause: str, width: int, text: str, expected: int) -> None:
    assert _outcomes(tmp_path, width, text) == {expected}, clause


@pytest.mark.parametrize(("clause", "width", "text"), OPEN)
def test_row_of_x_is_left_open(tmp_path: Path, clause: str, width: int, text: str) -> None:
    outcomes = _outcomes(tmp_path, width, text)
    assert {0, (1 << width) - 1} <= outcomes, clause


# Doubles, conversion by rounding and the operators of clauses 4.8.1, 4.8.2 and 17.8, in 32 bits; values by Icarus.
REALS = [
    "2.5", "-2.5", "0.49999999999999994", "-0.5", "1.5e0_0", "50_000_000/115200.0 + 0.5", "27e6/2 - 1", "7/2 + 0.5",
    "50e6/(2*9600.0)", "1e9/3", "0.1 + 0.2 == 0.3", "2.0**0.5*1e6", "2.0**24", "4.0**2", "10.0**-1*25", "-(1.5)",
    "+1.5", "(1 ? 3 : 2.5)/2", "(0 ? 2.5 : 7)/2*1.0", "!2.5", "!0.0", "0.5 && 1", "0.0 || 0", "2.5 > 2",
    "3.0 == 3", "2.5 >= 3", "2.5 != 2.5", "-1 < 0.5", "4'd15 < 15.5", "4'sd15 < 0.5", "$rtoi(-2.9)", "$rtoi(5208.9) + 1",
    "$itor(7)/2", "$ceil(2.1) + $floor(-2.1)", "$rtoi(50e6/9600)", "1.0*1e-320 > 0", "3 - 0.5*4 ? 5 : 6", "R", "-R*3", "R > 2",
    "I/2", "I/2.0", "I + R", "V", "G", "B", "U",
]  # fmt: skip
SIDES = ["6.5", "6.0", "-1.5", "-1.0", "-2", "0.0", "15.0", "15.5", "-8.0", "-8.5", "40.0"]


def test_real_constants(tmp_path: Path) -> None:
    rows = [(f"o{i}", 32, text) for i, text in enumerate(REALS)]
    for operator in ("<", "<=", ">", ">=", "==", "!="):
        for side in SIDES:
            for name in ("u4", "s4", "(u4 + 4'd9)", "s8"):
                rows += [(f"o{len(rows)}", 1, f"{name} {operator} {side}")]
                rows += [(f"o{len(rows)}", 1, f"{side} {operator} {name}")]
    ports = [f"input {'signed ' if s else ''}[{w - 1}:0] {n}" for n, (w, s) in INPUTS.items()]
    ports += [f"output signed [{width - 1}:0] {name}" for name, width, _ in rows]
    # What a parameter's own type makes of a real (clause 12.2): V keeps the fraction.
    body = "  parameter real R = 2.5; parameter integer I = 2.5; parameter V = 2.5; parameter real G = 7;\n"
    body += "  parameter [7:0] B = -1.5; parameter signed [3:0] U = -7.5;\n"
    body += "".join(f"  assign {name} = {text};\n" for name, _, text in rows)
    source = tmp_path / "many.v"
    source.write_text(f"module many({', '.join(ports)});\n{body}endmodule\n")
    vectors = [
        dict.fromkeys(INPUTS, 0) | {"u4": v & 15, "s4": v & 15, "s8": (v * 3 - 9) & 255} for v in range(16)
    ]
    expected = _simulate(tmp_path, source, [r[0] for r in rows], [r[1] for r in rows], vectors)
    signals = read_design([source]).signals
    for name, width, text in rows:
        for vector, known in zip(vectors, expected[name], strict=True):
            found = format(evaluate([signals[name].value], vector)[0], f"0{width}b")
            assert found == known, f"{text} at {vector}: {found}, simulator {known}"


class Writer:
    """Random expressions over the inputs; depth bounds their size."""

    def __init__(self, seed: int) -> None:
        self.random = random.Random(seed)
        self.strict = 0

    def leaf(self) -> str:
        pick = self.random.choice((0, 1, 2, 3, 5, 7, 8, 9)) if self.strict else self.random.randrange(10)
        name = self.random.choice(list(INPUTS))
        width, _ = INPUTS[name]
        if pick < 4:
            return name
        if pick == 4:
            return str(self.random.choice([0, 1, 2, 3, 7, 15, 100, 4000000000]))
        if pick == 5:
            size = self.random.choice([1, 2, 4, 5, 8, 12, 33])
            base, digits = self.random.choice([("d", "{:d}"), ("h", "{:x}"), ("b", "{:b}"), ("o", "{:o}")])
            sign = self.random.choice(["", "s"])
            return f"{size}'{sign}{base}" + digits.format(self.random.randrange(1 << min(size, 20)))
        if pick == 6:
            return self.random.choice(["'d5", "'sd7", "'h1F", "'b101", "8'shff", "3 'd5", "6'b01_01"])
        if pick == 7 and width > 1:
            return (
                f"{name}[{self.random.choice(['u3', 'u1', 's3', 'u4', str(self.random.randrange(width))])}]"
            )
        if pick == 8 and width > 3:
            base = self.random.choice(["u3", "1", "u4", "s4", "u1"])
            return (
                f"{name}[{base} {self.random.choice(['+:', '-:'])} 2]" if base != "1" else f"{name}[2 -: 2]"
            )
        if width > 2:
            return f"{name}[{width - 1}:{self.random.randrange(width - 1)}]"
        return name

    def term(self, depth: int) -> str:
        if depth == 0:
            return self.leaf()
        pick, r = self.random.randrange(22), self.random
        a, b = self.term(depth - 1), self.term(r.randrange(depth))
        if pick < 9:
            return f"({a} {r.choice(['+', '-', '*', '&', '|', '^', '~^', '^~'])} {b})"
        if pick < 11:
            return f"({a} {r.choice(['/', '%'])} {b})"
        if pick < 13:
            return f"({a} {r.choice(['<<', '>>', '<<<', '>>>'])} {r.choice(['u3', 's3', 'u1', 'u4', b])})"
        if pick < 15:
            return f"({a} {r.choice(['<', '>', '<=', '>=', '==', '!=', '===', '!==', '&&', '||'])} {b})"
        if pick < 17:
            return f"({self.term(0)} {r.choice(['', '== u1', '< s4'])} ? {a} : {b})"
        if pick == 17:
            return f"{r.choice(['~', '-', '+', '!', '&', '|', '^', '~&', '~|', '~^', '^~'])}({a})"
        if pick == 18:
            return f"{{{self.sized(depth - 1)}, {self.sized(0)}}}"
        if pick == 19:
            return f"{{{r.randrange(1, 4)}{{{self.sized(depth - 1)}}}}}"
        if pick == 20:
            return f"{r.choice(['$signed', '$unsigned'])}({a})"
        if self.strict:
            return a
        return f"(2 ** {r.choice(['u3', 'u4', '5'])} + {a})"

    def sized(self, depth: int) -> str:
        """A term whose width is given everywhere, as a concatenation needs it."""
        self.strict += 1
        text = self.term(depth)
        self.strict -= 1
        return text


def test_random_expressions(tmp_path: Path) -> None:
    writer = Writer(20240611)
    rng = writer.random
    outputs = []
    for i in range(600):
        width, sign = rng.choice([1, 3, 4, 8, 16, 32, 40, 64]), rng.choice(["", "signed "])
        outputs.append((f"o{i}", width, sign, writer.term(rng.choice([1, 2, 2, 3, 3, 4]))))
    sign_word = {True: "signed ", False: ""}
    ports = [f"input {sign_word[s]}[{w - 1}:0] {n}" for n, (w, s) in INPUTS.items()]
    ports += [f"output {sign}[{width - 1}:0] {name}" for name, width, sign, _ in outputs]
    body = "\n".join(f"  assign {name} = {text};" for name, _, _, text in outputs)
    source = tmp_path / "many.v"
    source.write_text(f"module many({', '.join(ports)});\n{body}\nendmodule\n")
    vectors = [
        {
            name: rng.choice([rng.getrandbits(width), 0, (1 << width) - 1])
            for name, (width, _) in INPUTS.items()
        }
        for _ in range(VECTORS)
    ]
    expected = _simulate(tmp_path, source, [o[0] for o in outputs], [o[1] for o in outputs], vectors)
    signals = read_design([source]).signals
    exact = 0
    for name, width, _, text in outputs:
        value = signals[name].value
        choices = [v.name for v in variables([value]) if v.name.startswith("?")]
        if choices and "==" in text.replace(" == ", "").replace(" != ", ""):
            # === and !== see x, which is any value here: the reading allows more than the simulator shows.
            continue
        for vector, known in zip(vectors, expected[name], strict=True):
            for choice in (0, (1 << 70) - 1):
                found = format(evaluate([value], vector | dict.fromkeys(choices, choice))[0], f"0{width}b")
                match = all(k in (f, "x", "z") for k, f in zip(known, found, strict=True))
                assert match, f"{text} in {width} bits at {vector}: {found}, simulator {known}"
            exact += "x" not in known
    assert exact > 4000


def _simulate(
    tmp_path: Path, source: Path, names: list[str], widths: list[int], vectors: list[dict[str, int]]
) -> dict[str, list[str]]:
    bench = tmp_path / "bench.v"
    declared = "".join(f"  reg [{w - 1}:0] {n};\n" for n, (w, _) in INPUTS.items())
    declared += "".join(f"  wire [{w - 1}:0] {n};\n" for n, w in zip(names, widths, strict=True))
    ports = ", ".join(f".{n}({n})" for n in [*INPUTS, *names])
    steps = "".join(
        "    " + " ".join(f"{n} = {INPUTS[n][0]}'d{v};" for n, v in vector.items()) + " #1;\n"
        + "".join(f'    $display("%b", {n});\n' for n in names)
        for vector in vectors
    )  # fmt: skip
    bench.write_text(
        f"module bench;\n{declared}  many dut({ports});\n  initial begin\n{steps}  end\nendmodule\n"
    )
    built = tmp_path / "bench.vvp"
    subprocess.run(
        ["iverilog", "-g2005", "-o", str(built), str(bench), str(source)],
        check=True,
        timeout=60,
        capture_output=True,
    )
    ran = subprocess.run(["vvp", "-n", str(built)], check=True, timeout=60, capture_output=True, text=True)
    lines = ran.stdout.split()
    count = len(names)
    return {name: lines[i::count] for i, name in enumerate(names)}
