"""Random programs: processes, loops, functions, tasks and generate against an event simulator, edge by edge.

The designs are evaluated here by the plainest means, one clock and one reset, and not by `prover.system`.
"""

from __future__ import annotations

import random
import subprocess
from pathlib import Path

from prover.design import Design
from prover.expr import evaluate, variables
from prover.verilog import read_design

CYCLES = 14
PROGRAMS = 120


class Program:
    """One module with registers r*, values t*, a wire for each of them, and statements over them."""

    def __init__(self, seed: int) -> None:
        self.random = r = random.Random(seed)
        self.name = f"m{seed}"
        self.regs = {
            f"r{i}": (r.choice([1, 2, 4, 8, 8, 11]), r.random() < 0.3) for i in range(r.randrange(2, 5))
        }
        self.temps = {f"t{i}": (r.choice([1, 4, 8, 16]), r.random() < 0.3) for i in range(2)}
        self.wires = {f"w{i}": (r.choice([1, 4, 8]), False) for i in range(2)}
        self.blocking = r.random() < 0.3
        self.level = r.choice(["posedge", "negedge"])
        self.labels = 0

    def width(self, name: str) -> int:
        return (self.regs | self.temps | self.wires | {"k": (3, False), "kk": (3, False)})[name][0]

    def value(self, names: list[str], depth: int) -> str:
        r = self.random
        if depth == 0 or r.random() < 0.15:
            name = r.choice(names)
            pick = r.randrange(5)
            if pick == 0:
                return r.choice(["0", "1", "3", "4'd9", "8'hA5", "3'sd2", "-1", "2'b10", "'d12"])
            if pick == 1 and self.width(name) == 8:
                return f"{name}[{r.choice(['k', str(r.randrange(8))])}]"
            if pick == 2 and self.width(name) >= 4:
                return f"{name}[{r.choice(['3:1', '1 +: 2', '3 -: 3'])}]"
            return name
        a, b = self.value(names, depth - 1), self.value(names, depth - 1)
        pick = r.randrange(12)
        if pick < 5:
            return f"({a} {r.choice(['+', '-', '*', '&', '|', '^', '~^'])} {b})"
        if pick == 5:
            return f"({a} {r.choice(['<<', '>>', '>>>'])} {r.randrange(4)})"
        if pick < 8:
            return f"({a} {r.choice(['<', '>', '<=', '>=', '==', '!=', '&&', '||'])} {b})"
        if pick == 8:
            return f"({a} ? {b} : {self.value(names, depth - 1)})"
        if pick == 9:
            return f"{r.choice(['~', '-', '!', '&', '|', '^', '~|'])}({a})"
        if pick == 10:
            return f"{{{r.choice(names)}, {r.choice(names)}}}"
        return f"f({a}, {b})"

    def assign(self, names: list[str], readable: list[str], op: str) -> str:
        r = self.random
        target = r.choice(names)
        value = self.value(readable, r.randrange(1, 4))
        pick = r.randrange(6)
        if pick == 0 and self.width(target) == 8:
            return f"{target}[{r.choice(['k', 'k', '2'])}] {op} {value};"
        if pick == 1 and self.width(target) >= 4:
            return f"{target}[{r.choice(['2:1', '1 +: 2'])}] {op} {value};"
        if pick == 2 and len(names) > 1:
            one, two = r.sample(names, 2)
            return f"{{{one}, {two}}} {op} {value};"
        return f"{target} {op} {value};"

    def statement(self, names: list[str], readable: list[str], op: str, depth: int) -> str:
        r = self.random
        pick = r.randrange(10) if depth else 0
        if pick < 3:
            return self.assign(names, readable, op)
        inner = [self.statement(names, readable, op, depth - 1) for _ in range(3)]
        if pick < 5:
            return f"if ({self.value(readable, 2)}) begin {inner[0]} {inner[1]} end else {inner[2]}"
        if pick == 5:
            return f"if ({self.value(readable, 1)}) {inner[0]}"
        if pick == 6:
            kind = r.choice(["case", "casez"])
            labels = ["2'b0?, 3", "2'b10"] if kind == "casez" else ["0, 3", "4'd2"]
            # Braces make the subject unsigned: Icarus 11 extends a signed one by its sign beside an unsigned
            # label, where clause 5.5.1 has all of them unsigned.
            arms = f"{labels[0]}: {inner[0]} {labels[1]}: begin {inner[1]} end"
            return f"{kind} ({{{r.choice(readable)}}}) {arms} default: {inner[2]} endcase"
        if pick == 7:
            self.labels += 1
            return f"begin : b{self.labels} {inner[0]} {inner[1]} end"
        if pick == 8:
            return f"for (k = 0; k < {r.randrange(1, 6)}; k = k + 1) {self.assign(names, readable, op)}"
        return f"begin {inner[0]} {inner[1]} {inner[2]} end"

    def text(self) -> str:
        r = self.random
        sign = {True: "signed ", False: ""}
        regs = "".join(
            f"  reg {sign[s]}[{w - 1}:0] {n} = {r.randrange(1 << w)};\n" for n, (w, s) in self.regs.items()
        )
        temps = "".join(f"  reg {sign[s]}[{w - 1}:0] {n} = 0;\n" for n, (w, s) in self.temps.items())
        wires = {name: width for name, (width, _) in self.wires.items()}
        with_temps = [*self.regs, *self.temps, "k"]
        first = [f"{t} = {self.value([*self.regs, *wires], 2)};" for t in self.temps]
        temporary = [self.statement(list(self.temps), with_temps, "=", 2) for _ in range(2)]
        op = "=" if self.blocking else "<="
        main = [self.statement(list(self.regs), with_temps, op, 3) for _ in range(3)]
        resets = " ".join(
            f"{n} {op} {r.randrange(1 << w)};" for n, (w, _) in self.regs.items() if r.random() < 0.8
        )
        test = "rst" if self.level == "posedge" else "!rst"
        body = f"begin k = {r.randrange(7)}; {' '.join(first)} {' '.join(temporary)} {' '.join(main)} end"
        clocked = f"  always @(posedge clk or {self.level} rst) if ({test}) begin {resets} end else {body}\n"
        combinational = [f"{n} = {self.value(list(self.regs), 2)};" for n in wires]
        combinational += [
            self.statement(list(wires), list(self.regs), "=", 2).replace("k", "kk") for _ in range(2)
        ]
        nets = "".join(f"  reg [{w - 1}:0] {n};\n" for n, w in wires.items())
        function = (
            "  function [7:0] f(input [3:0] a, input signed [7:0] b);\n    integer n;\n    begin\n"
            f"      f = {r.choice(['a + b', 'b >>> 1', '{a, 4!b1}'.replace('!', chr(39))])};\n"
            "      for (n = 0; n < 3; n = n + 1) if (a[n]) f = f ^ (b << n);\n    end\n  endfunction\n"
        )
        outputs = ", ".join(f"o_{n}" for n in [*self.regs, *wires])
        ports = "".join(f"  output [15:0] o_{n};\n  assign o_{n} = {n};\n" for n in [*self.regs, *wires])
        return (
            f"module {self.name}(clk, rst, {outputs});\n  input clk, rst;\n{regs}{temps}{nets}"
            "  reg [2:0] k = 0, kk;\n"
            f"{ports}{function}{clocked}  always @* begin kk = 2; {' '.join(combinational)} end\nendmodule\n"
        )


def _run(design: Design, level: int) -> list[str]:
    """The outputs after each half of CYCLES cycles, with the reset active in cycles 5 and 6."""
    state = {r.name: r.initial for r in design.registers}
    assert None not in state.values(), design
    known: dict[str, int] = {name: value or 0 for name, value in state.items()}
    out = []
    for cycle in range(CYCLES):
        rst = level if cycle in (5, 6) else 1 - level
        for clk in (0, 1):
            inputs = {"clk": clk, "rst": rst}
            if clk:
                known |= _values(
                    design, [(r.name, r.edges[0].data) for r in design.registers if r.edges], known | inputs
                )
            for register in design.registers:
                for force in reversed(register.forces):
                    if evaluate([force.when], known | inputs)[0]:
                        known |= _values(design, [(register.name, force.value)], known | inputs)
            values = [evaluate([design.signals[o].value], known | inputs)[0] for o in design.outputs]
            out.append(" ".join(map(str, values)))
    return out


def _values(design: Design, pairs: list[tuple[str, object]], values: dict[str, int]) -> dict[str, int]:
    exprs = [expr for _, expr in pairs]
    assert not [v for v in variables(exprs) if v.name.startswith("?")], design  # type: ignore[arg-type]
    return dict(zip([name for name, _ in pairs], evaluate(exprs, values), strict=True))  # type: ignore[arg-type]


def test_random_programs(tmp_path: Path) -> None:
    check(tmp_path, range(PROGRAMS))


def check(tmp_path: Path, seeds: range) -> None:
    programs = [Program(seed) for seed in seeds]
    texts = {p.name: p.text() for p in programs}
    for name, text in texts.items():
        (tmp_path / f"{name}.v").write_text(text)
    designs = {p.name: read_design([tmp_path / f"{p.name}.v"]) for p in programs}
    lines = ["module bench;", "  reg clk = 0, low = 1, high = 0; integer c;"]
    prints: dict[str, str] = {}
    for p in programs:
        outputs = designs[p.name].outputs
        for o in outputs:
            lines.append(f"  wire [15:0] {p.name}_{o};")
        rst = "high" if p.level == "posedge" else "low"
        links = ", ".join(f".{o}({p.name}_{o})" for o in outputs)
        lines.append(f"  {p.name} u_{p.name}(.clk(clk), .rst({rst}), {links});")
        listed = ", ".join(f"{p.name}_{o}" for o in outputs)
        prints[p.name] = f'$display("{" ".join(["%0d"] * len(outputs))}", {listed});'
    show = " ".join(prints.values())
    lines.append(f"  initial for (c = 0; c < {CYCLES}; c = c + 1) begin")
    lines.append("    clk = 0; high = c == 5 || c == 6; low = !high; #1;")
    lines.append(f"    {show} clk = 1; #1; {show} end")
    lines.append("endmodule")
    bench = tmp_path / "bench.v"
    bench.write_text("\n".join(lines))
    built = tmp_path / "bench.vvp"
    files = [str(tmp_path / f"{p.name}.v") for p in programs]
    subprocess.run(["iverilog", "-g2005", "-o", str(built), str(bench), *files], check=True, timeout=60)
    ran = subprocess.run(["vvp", "-n", str(built)], check=True, timeout=60, capture_output=True, text=True)
    printed = ran.stdout.splitlines()
    moved = 0
    for i, p in enumerate(programs):
        expected = printed[i :: len(programs)]
        found = _run(designs[p.name], int(p.level == "posedge"))
        assert found == expected, f"{texts[p.name]}\n{designs[p.name]}"
        moved += len(set(expected)) > 3
    assert moved > len(programs) // 2
