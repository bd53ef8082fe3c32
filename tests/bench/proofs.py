"""What a proof costs as the ratio grows: this project beside unrolling, a Horn engine and an event simulator.

    python tests/bench/proofs.py [limit in seconds]

Every road gets the same question, "from reset, the output of the divider has period 2N half-cycles and is high N of
them", and the same limit; "not within" means just that. The second table is about recovery from every power-up state:
this project beside enumerating all states. The third is about linear shift registers, as multiples of the divide by
three. Prints tables and asserts nothing.
"""

from __future__ import annotations

import subprocess
import sys
import tempfile
import time
from collections.abc import Callable
from fractions import Fraction
from functools import partial
from pathlib import Path

sys.path[:0] = [str(Path(__file__).parents[2]), str(Path(__file__).parents[1])]

import z3

from prover import Spec, check
from prover import expr as e
from prover.api import read
from prover.effort import Effort
from prover.ports import Ports, recognise
from prover.rhythm import Goal
from prover.settling import settle
from prover.system import System

RATIOS = (3, 31, 301, 3001, 50_000_001, 2_147_483_647)
LATE = "not within"

SOURCE = """module odd (input clk, input rst, output slow);
  reg [31:0] count;
  reg late;
  wire upper = count >= {half};
  always @(posedge clk)
    if (rst) count <= 0;
    else count <= count >= {last} ? 0 : count + 1;
  always @(negedge clk) late <= upper;
  assign slow = upper | late;
endmodule
"""

TOGGLE = """module toggle (input clk, input rst, output reg slow);
  reg [{top}:0] count;
  always @(posedge clk)
    if (rst) begin count <= 0; slow <= 0; end
    else if (count == {last}) begin count <= 0; slow <= ~slow; end
    else count <= count + 1;
endmodule
"""

SHIFT = """module shift (input clk, input rst, output pulse);
  reg [{n}:1] q;
  always @(posedge clk)
    if (rst) q <= {start};
    else q <= {{q[{m}:1], {feedback}}};
  assign pulse = q == 5;
endmodule
"""

TAPS = {16: (16, 15, 13, 4), 20: (20, 17), 24: (24, 23, 22, 17), 32: (32, 22, 2, 1)}


def main() -> None:
    limit = float(sys.argv[1]) if len(sys.argv) > 1 else 10.0
    with tempfile.TemporaryDirectory() as folder:
        ratios(Path(folder), limit)
        recoveries(Path(folder), limit)
        registers(Path(folder))


def timed(work: Callable[[], bool], limit: float) -> str:
    """Seconds that the work took, or that it did not come to an answer within the limit."""
    began = time.perf_counter()
    done = work()
    took = time.perf_counter() - began
    return f"{took:.2f}" if done and took <= limit else LATE


# -- ratios --------------------------------------------------------------------------------------------------


def ratios(folder: Path, limit: float) -> None:
    print(f"from reset, seconds, at most {limit:g}")
    print(f"{'N':>14}{'this project':>14}{'unrolling':>12}{'Horn':>12}{'simulator':>12}")
    for n in RATIOS:
        file = folder / "odd.v"
        file.write_text(SOURCE.format(half=(n + 1) // 2, last=n - 1))
        ports = recognise(read([file]), Spec())
        system, _ = settle(ports.design, ports.clock, ports.running, ports.output_value, Effort(60))
        cells = [
            timed(partial(ours, file, n), limit),
            timed(partial(unrolled, system, n, limit), limit),
            timed(partial(horn, system, n, limit), limit),
            timed(partial(simulated, ports, file, n, limit), limit),
        ]
        print(f"{n:>14}{cells[0]:>14}{cells[1]:>12}{cells[2]:>12}{cells[3]:>12}", flush=True)


def ours(file: Path, n: int) -> bool:
    report = check([file], Spec(ratio=Fraction(n)))
    return [f.verdict for f in report.findings[:2]] == ["proved", "proved"]


def unrolled(system: System, n: int, limit: float) -> bool:
    """One whole period unrolled from where the output falls: it is as claimed in each half-cycle, and the state comes
    back."""
    began = time.perf_counter()
    solver = z3.SolverFor("QF_BV")
    state = [z3.BitVecVal(0, w) for _, w in system.variables[:-1]] + [z3.BitVecVal(0, 1)]
    names = [z3.BitVec(name, w) for name, w in system.variables]
    step = e.z3_terms([*system.step, system.output])
    first = state
    wrong = []
    for t in range(2 * n):
        if time.perf_counter() - began > limit:
            return False
        *after, out = (z3.substitute(x, *zip(names, state, strict=True)) for x in step)
        fresh = [z3.BitVec(f"s{t}.{i}", x.size()) for i, x in enumerate(after)]
        solver.add(*(a == b for a, b in zip(fresh, after, strict=True)))
        wrong.append(out != (0 if t < n else 1))
        state = fresh
    wrong += [a != b for a, b in zip(state, first, strict=True)]
    solver.add(z3.Or(wrong))
    solver.set("timeout", max(1, int(1000 * (limit - time.perf_counter() + began))))
    return bool(solver.check() == z3.unsat)


def horn(system: System, n: int, limit: float) -> bool:
    """A monitor that counts half-cycles since the last change of the output never sees a run of another length."""
    engine = z3.Fixedpoint()
    engine.set("engine", "spacer", "timeout", max(1, int(1000 * limit)))
    names = [z3.BitVec(name, w) for name, w in system.variables]
    age = z3.BitVec("age", 34)
    sorts = [x.sort() for x in [*names, age]]
    reached = z3.Function("reached", *sorts, z3.BoolSort())
    engine.register_relation(reached)
    engine.declare_var(*names, age)
    start = [z3.BitVecVal(0, w) for _, w in system.variables[:-1]] + [z3.BitVecVal(0, 1), z3.BitVecVal(0, 34)]
    engine.fact(reached(*start))
    *after, out = e.z3_terms([*system.step, system.output])
    following = z3.substitute(out, *zip(names, after, strict=True))
    older = z3.If(following == out, age + 1, z3.BitVecVal(0, 34))
    engine.rule(reached(*after, older), [reached(*names, age)])
    bad = z3.Or(z3.And(following != out, age != n - 1), age >= n)
    failed = z3.Function("failed", z3.BoolSort())
    engine.register_relation(failed)
    engine.rule(failed(), [reached(*names, age), bad])
    try:
        return bool(engine.query(failed()) == z3.unsat)
    except z3.Z3Exception:
        return False


def simulated(ports: Ports, file: Path, n: int, limit: float) -> bool:
    """One output period in the event simulator: that is no proof, and only a yardstick."""
    bench = file.with_name("bench.v")
    bench.write_text(
        f"`timescale 1ns/1ns\nmodule bench; reg clk = 0, rst = 1; wire slow; {ports.design.top} d(clk, rst, slow);\n"
        f"initial begin #1 clk = 1; #1 clk = 0; #1 rst = 0; repeat ({2 * n}) #1 clk = ~clk; $finish; end endmodule\n"
    )
    program = file.with_name("bench.vvp")
    try:
        subprocess.run(["iverilog", "-o", program, bench, file], check=True, timeout=limit)
        subprocess.run(["vvp", "-n", program], check=True, timeout=limit, capture_output=True)
    except subprocess.TimeoutExpired:
        return False
    return True


# -- recovery ------------------------------------------------------------------------------------------------


def recoveries(folder: Path, limit: float) -> None:
    from prover import graph

    print(f"\nrecovery of a toggle divider with an exact compare, seconds, at most {limit:g}")
    print(f"{'bits':>14}{'half-cycles':>16}{'this project':>14}{'all states':>12}")
    for bits in (10, 14, 18, 20, 26, 32, 48):
        file = folder / "toggle.v"
        last = (1 << bits) * 3 // 8
        file.write_text(TOGGLE.format(top=bits - 1, last=last))
        worst: list[object] = []

        def asked(file: Path = file, last: int = last, worst: list[object] = worst) -> bool:
            recovery = check([file], Spec(ratio=Fraction(2 * (last + 1)))).rhythm.recovery
            worst.append(recovery.worst if recovery else None)
            return recovery is not None and recovery.exact

        def enumerated(file: Path = file, last: int = last) -> bool:
            ports = recognise(read([file]), Spec())
            system, _ = settle(ports.design, ports.clock, ports.running, ports.output_value, Effort(60))
            if not graph.fits(system):
                return False
            states = graph.build(system, Effort(limit))
            period = 4 * (last + 1)
            found = graph.basins(states, Effort(limit), Goal(period, period // 2))
            graph.ranks(states, found, Goal(period, period // 2))
            return True

        cells = [timed(asked, limit), timed(enumerated, limit)]
        print(f"{bits:>14}{worst[0]!s:>16}{cells[0]:>14}{cells[1]:>12}", flush=True)


# -- linear shift registers ----------------------------------------------------------------------------------


def registers(folder: Path) -> None:
    file = folder / "odd.v"
    file.write_text(SOURCE.format(half=2, last=2))
    began = time.perf_counter()
    check([file], Spec(ratio=Fraction(3)))
    base = time.perf_counter() - began
    print(
        f"\nlinear shift registers, period 2^n − 1 and lock-up, as multiples of the divide by three ({base:.2f} s)"
    )
    print(f"{'bits':>14}{'xor':>12}{'xnor':>12}")
    for n, taps in TAPS.items():
        cells = []
        for sign, start in (("", 1), ("~", 0)):
            feedback = f"{sign}({' ^ '.join(f'q[{tap}]' for tap in taps)})"
            file.write_text(SHIFT.format(n=n, m=n - 1, start=start, feedback=feedback))
            began = time.perf_counter()
            report = check([file], Spec(ratio=Fraction(2**n - 1), high=2))
            took = time.perf_counter() - began
            verdicts = [f.verdict for f in report.findings]
            right = verdicts[:2] == ["proved", "proved"] and verdicts[2] == "refuted"
            cells.append(f"{took / base:.1f}" if right else "?")
        print(f"{n:>14}{cells[0]:>12}{cells[1]:>12}", flush=True)


if __name__ == "__main__":
    main()
