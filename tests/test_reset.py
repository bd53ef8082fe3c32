"""Reset and its releases on random small machines, against plain enumeration, and on a few dividers by hand.

Enumeration holds reset from every state at rest, one half-cycle after another. A flip-flop that is late is had by
giving each bit of each register an input of its own for reset.
"""

from __future__ import annotations

import random
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import product
from pathlib import Path

import pytest
from agreement import brute
from agreement.releases import Map, Run, faults, joined, off, walk
from machines import random_design, resettable
from texts import checked

from properties import reset as judged
from prover import analyse, trace
from prover import expr as e
from prover.design import Design, Edge, Register
from prover.effort import Effort
from prover.expr import Expr
from prover.findings import Finding, Report
from prover.ports import Ports, recognise
from prover.release import Release
from prover.rhythm import Rhythm
from prover.settling import settle
from prover.spec import Spec
from prover.system import State, System
from prover.trace import Rest


@dataclass(frozen=True)
class Machine:
    """A machine as maps: running and under reset, on the states at rest there, and its output while it runs."""

    ports: Ports
    running: System
    step: Map
    held: Map
    output: Mapping[State, int]
    limit: int


def maps(system: System) -> tuple[dict[State, State], dict[State, int]]:
    """Where each state at rest leads, and what the output is in it."""
    after, out = {}, {}
    for state in product(*(range(1 << w) for _, w in system.variables)):
        values = dict(zip(system.names, state, strict=True))
        *step, level, rest = e.evaluate([*system.step, system.output, system.settled], values)
        if rest:
            after[state], out[state] = tuple(step), level
    return after, out


def machine(ports: Ports) -> Machine | None:
    """The machine; None for one that does not settle, running or under reset."""
    design, effort = ports.design, Effort(60)
    running, settled = settle(design, ports.clock, ports.running, ports.output_value, effort)
    under, settles = settle(design, ports.clock, ports.resetting, ports.output_value, effort, races=False)
    if settled.depth is None or settles.depth is None:
        return None
    step, output = maps(running)
    return Machine(ports, running, step, maps(under)[0], output, 2 * len(design.registers) + 20)


def holding(held: Map, kept: Sequence[int]) -> tuple[set[State], dict[int, int]]:
    """The states that any length of reset may end in; and by the level it begins at how long it takes until what is
    kept of a state is as in one of those."""

    def part(states: Iterable[State]) -> set[State]:
        return {tuple(state[place] for place in kept) for state in states}

    recurrent = {state for loop in brute.find_loops(held) for state in loop}
    needs = {}
    for level in (0, 1):
        states, count = {state for state in held if state[-1] == level}, 0
        while not part(states) <= part(recurrent):
            states, count = {held[state] for state in states}, count + 1
        needs[level] = count
    return recurrent, needs


# -- releases, with a reset input for each bit -------------------------------------------------------------


def split(design: Design) -> tuple[Design, dict[str, tuple[str, int]]]:
    """The design with registers of one bit, each with an input of its own for reset, by which it is named there."""
    whole = {
        r.name: e.concat_all([e.var(f"{r.name}[{i}]", 1) for i in reversed(range(r.width))])
        for r in design.registers
    }
    places, made = {}, []
    for r in design.registers:
        for i in range(r.width):
            places[f"rst {r.name}[{i}]"] = (r.name, i)
            made.append(_bit(r, i, {**whole, "rst": e.var(f"rst {r.name}[{i}]", 1)}))
    inputs = {"clk": 1, **dict.fromkeys(places, 1)}
    return replace(design, inputs=inputs, registers=tuple(made)), places


def _bit(register: Register, i: int, values: Mapping[str, Expr]) -> Register:
    def put(x: Expr, part: bool) -> Expr:
        (x,) = e.substitute([x], values)
        return e.extract(x, i, i) if part else x

    edges = tuple(Edge(put(edge.clock, False), put(edge.data, True)) for edge in register.edges)
    forces = tuple(replace(f, when=put(f.when, False), value=put(f.value, True)) for f in register.forces)
    return replace(register, name=f"{register.name}[{i}]", width=1, edges=edges, forces=forces)


def freed(made: Machine, state: State, late: str | None) -> tuple[list[int], State]:
    """The output in halves of a half-cycle until all is released, and the state then; `late` is the input that is
    released after the next edge."""
    design, places = split(made.ports.design)
    registers = {
        f"{r.name}[{i}]": state[place] >> i & 1
        for place, r in enumerate(made.ports.design.registers)
        for i in range(r.width)
    }
    active = made.ports.reset.active if made.ports.reset else 1
    first = Rest(0, False, dict.fromkeys(places, active), {**registers, "clk": state[-1]}, {})
    moves: list[Mapping[str, int]] = [{name: 1 - active for name in places if name != late}]
    if late is not None:
        moves.append({late: 1 - active})
    rests = trace.run(design, "clk", {}, first, moves, made.limit)
    states = [_joined(made.ports.design, rest) for rest in rests[1:]]
    # A rest after the release, then one after the edge, and one after the late release, if that changes anything.
    return [_level(made, at) for at in states[:2]] if late else [], states[-1]


def _joined(design: Design, rest: Rest) -> State:
    values = (sum(rest.registers[f"{r.name}[{i}]"] << i for i in range(r.width)) for r in design.registers)
    return (*values, rest.registers["clk"])


def _level(made: Machine, state: State) -> int:
    """The output with reset released, whether or not the state is at rest."""
    return made.running.out(state)


def sees_reset(design: Design, name: str) -> bool:
    (register,) = (r for r in design.registers if r.name == name)
    used = [x for edge in register.edges for x in (edge.clock, edge.data)]
    used += [x for force in register.forces for x in (force.when, force.value)]
    return "rst" in {v.name for v in e.variables(used)}


# -- verdicts ----------------------------------------------------------------------------------------------


def expected(made: Machine, spec: Spec, recurrent: Sequence[State]) -> tuple[str, bool]:
    """The verdict, and whether it carries an obligation."""
    found = brute.analyse(made.step, made.output, spec.period, spec.high_half_cycles)
    _, places = split(made.ports.design)

    def runs(state: State, late: str | None) -> tuple[State, list[Run]]:
        early, after = freed(made, state, late)
        levels = walk(after, made.step, made.output, found, spec)
        return after, list(joined(made.running.out(state), early, levels))

    on_time = {state: runs(state, None) for state in recurrent}
    for after, seen in on_time.values():
        if any(faults(after, seen, found, spec)):
            return "refuted", False
    if any(len({tuple(on_time[s][1][:-1]) for s in recurrent if s[-1] == level}) > 1 for level in (0, 1)):
        return "refuted", False
    owed = False
    for state in recurrent:
        for late, (name, _) in places.items():
            if not sees_reset(made.ports.design, name):
                continue
            after, seen = runs(state, late)
            if found.recovery_half_cycles[after] is None:
                return "refuted", False
            usual = [off(on_time[other][1], spec) for other in recurrent if other[-1] == state[-1]]
            owed |= bool(off(seen, spec)) and off(seen, spec) not in usual
    return "proved", owed


def found_in(rhythm: Rhythm, spec: Spec) -> tuple[Finding, Release]:
    finding, release = judged.judge(rhythm, spec), rhythm.release
    assert finding is not None
    assert release is not None
    return finding, release


def claim_of(ports: Ports) -> Spec | None:
    """The wave after the first release, if it has one pulse a period."""
    rhythm = analyse.rhythm_of(ports, Spec(reset="rst=1"), Effort(60))
    wave = rhythm.orbits[0].wave() if rhythm.orbits else None
    if wave is None or wave.period is None or len(wave.runs) != 2:
        return None
    return Spec(ratio=Fraction(wave.period, 2), high=wave.high, reset="rst=1")


@pytest.mark.parametrize("block", range(3))
def test_random_machines_agree_with_enumeration(block: int) -> None:
    verdicts = [agrees_with_enumeration(seed) for seed in range(24 * block, 24 * block + 24)]
    assert verdicts.count("proved") >= 4
    assert verdicts.count("refuted") >= 4


def agrees_with_enumeration(seed: int) -> str:
    """The verdict on a random machine with a reset, compared with enumeration; "" where there is nothing to compare."""
    rng = random.Random(seed)
    design = resettable(rng, random_design(rng, rng.randint(2, 5)))
    if not any(sees_reset(design, register.name) for register in design.registers):
        return ""
    ports = recognise(design, Spec(reset="rst=1"))
    made = machine(ports)
    if made is None:
        return ""
    spec = claim_of(ports) or Spec(ratio=Fraction(2), reset="rst=1")
    finding, release = found_in(analyse.rhythm_of(ports, spec, Effort(60)), spec)
    kept = [made.running.names.index(name) for name in release.held.names]
    recurrent, needs = holding(made.held, kept)
    assert set(release.held.states) == {tuple(s[place] for place in kept) for s in recurrent}, seed
    assert release.held.needs == (needs[0], needs[1]), seed
    assert release.held.exact
    verdict, owed = expected(made, spec, sorted(recurrent))
    assert finding.verdict == verdict, (seed, finding.says)
    if verdict == "proved":
        assert bool(finding.obligations) == owed, seed
    if finding.trace is not None:
        assert not trace.faults(design, "clk", {"out": ports.output_value}, finding.trace, made.limit)
    else:
        assert (finding.counterexample is not None) == (verdict == "refuted")
    return verdict


# -- by hand -----------------------------------------------------------------------------------------------

SHIFT_LONG = """\
module shift_long (input clk, input rst, output tick);
  reg [39:0] line;
  reg half;
  always @(posedge clk) line <= {line[38:0], rst};
  always @(posedge clk) half <= line[39] ? 1'b0 : ~half;
  assign tick = half;
endmodule
"""

FREE = """\
module free (input clk, input rst, output tick);
  reg [15:0] slow;
  reg half;
  always @(posedge clk) slow <= slow + 16'd1;
  always @(posedge clk) if (rst) half <= 1'b0; else if (slow == 16'd0) half <= ~half;
  assign tick = half;
endmodule
"""

BESIDE = """\
module beside (input clk, input rst, output tick, output [11:0] count);
  reg [11:0] slow;
  reg half;
  always @(posedge clk) slow <= slow + 12'd1;
  always @(posedge clk) if (rst) half <= 1'b0; else half <= ~half;
  assign tick = half;
  assign count = slow;
endmodule
"""


def reset_of(report: Report) -> Finding:
    return next(finding for finding in report.findings if finding.name == "reset")


def test_a_long_line_takes_as_long_as_it_is(tmp_path: Path) -> None:
    # The reset has to run through forty stages, a rising edge each, and then clear the toggle: 41 rising edges.
    finding = reset_of(checked(tmp_path, SHIFT_LONG, "2", reset="rst=1"))
    assert finding.facts["shortest_reset_by_clock_level"] == {"low": 81, "high": 82}
    assert finding.facts["shortest_reset_is_exact"] is True


def test_a_wide_register_that_reset_never_forces_refutes(tmp_path: Path) -> None:
    finding = reset_of(checked(tmp_path, FREE, "131072"))
    assert finding.verdict == "refuted"
    assert "slow" in finding.says


def test_a_wide_register_beside_the_divider_does_not_matter(tmp_path: Path) -> None:
    finding = reset_of(checked(tmp_path, BESIDE, "2", output="tick"))
    assert finding.verdict == "proved"
