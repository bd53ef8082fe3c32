"""Reset and its releases in the event simulator, for every case of up to 12 register bits.

How long reset has to be held is read from runs under reset from every power-up state; what a release leads to, from
runs after it and from the simulator's own map. A flip-flop that is released an edge late has its reset value once more
after that edge; that is set by hand, which is right where no register clocks another one. Pulses are counted here on
levels written out one by one.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import replace
from typing import Any

import pytest
from agreement import brute, simulator
from agreement.releases import Map, Run, faults, joined, off, walk
from agreement.simulator import Bench, Reset, Start
from agreement.stepping import differences, power_up_states
from agreement.test_cases_agreement import SETTLING, bench_of, in_numbers, spec_of
from cases_format import Case, Group

from prover import expr as e
from prover.api import check
from prover.findings import Finding, Report
from prover.ports import Ports
from prover.spec import Spec
from prover.system import State
from prover.trace import Trace


def resets() -> list[Any]:
    """The groups with a reset; options that change nothing about it are tried once."""
    with_reset = [each for each in SETTLING if "reset" in each.values[1].properties]
    return [
        each
        for each in with_reset
        if not {"--start", "--within", "--waive", "--mean"} & {*each.values[1].options}
    ]


@pytest.mark.parametrize(("case", "group"), resets())
def test_reset_is_as_the_simulator_has_it(case: Case, group: Group) -> None:
    for spec in in_numbers(case, spec_of(group)):
        compare(case, spec)


def test_many_cases_have_a_reset() -> None:
    assert len(resets()) > 70


def compare(case: Case, spec: Spec) -> None:
    report = check([case.path], spec)
    finding = next(each for each in report.findings if each.name == "reset")
    if finding.verdict == "open":
        assert "do not settle" in finding.says
        return
    bench, states = bench_of(case, report.ports, spec), power_up_states(report.rhythm.system)
    if finding.trace is not None:
        compare_trace(report.ports, bench, finding.trace)
    if report.rhythm.release and report.rhythm.release.held.unforced:
        compare_unforced(report, finding, bench)
        return
    if spec.reset_cycles is not None:
        compare_too_short(report, finding, bench, states)
        spec = replace(spec, reset_cycles=None)
        report = check([case.path], spec)
        finding = next(each for each in report.findings if each.name == "reset")
    under = compare_holding(report, finding, bench, states)
    told, step, output = differences(report.rhythm.system, bench, states, 1)
    assert not told
    found = brute.analyse(step, output, spec.period, spec.high_half_cycles)
    on_time = released(report.ports, bench, [state for state, _ in under])
    runs = {
        state[-1]: [*joined(level, [], walk(state, step, output, found, spec))]
        for state, (_, level) in zip(on_time, under, strict=True)
    }
    shown = [text for state in on_time for text in faults(state, runs[state[-1]], found, spec)]
    compare_edges(finding, runs)
    if any(net_of_registers(report.ports)):
        # What a late flip-flop clocks is not told by setting bits. None of these refutes by that alone.
        assert finding.verdict == ("refuted" if shown else "proved"), shown
        return
    late = [
        (state, run)
        for (before, level), freed in zip(under, on_time, strict=True)
        for state, early in late_states(report.ports, before, freed, step, output)
        for run in [[*joined(level, early, walk(state, step, output, found, spec))]]
    ]
    lost = [state for state, _ in late if found.recovery_half_cycles[state] is None]
    assert finding.verdict == ("refuted" if shown or lost else "proved"), (shown, lost)
    if finding.verdict == "proved":
        usual = [off(run, spec) for run in runs.values()]
        owed = any(off(run, spec) and off(run, spec) not in usual for _, run in late)
        assert bool(finding.obligations) == owed


def compare_trace(ports: Ports, bench: Bench, trace: Trace) -> None:
    """A refutation's trace, run in the simulator: registers and output at every rest."""
    first, reset = trace.rests[0], ports.reset
    assert reset is not None
    *values, clock = first.registers.values()
    (moved,) = [rest.half_cycle for rest in trace.rests if rest.moved]
    pulse = Reset(reset.port, reset.active, moved, watched=True)
    (run,) = simulator.run(bench, [Start(tuple(values), clock)], trace.half_cycles - 1 - moved, pulse)
    seen = [(tuple(rest.registers.values())[:-1], rest.outputs[ports.output]) for rest in trace.rests]
    assert [(sample.values, sample.output) for sample in run] == seen


def compare_unforced(report: Report, finding: Finding, bench: Bench) -> None:
    """Reset held for 40 half-cycles from either value of each bit that is said not to be forced: it still differs."""
    reset, release = report.ports.reset, report.rhythm.release
    assert reset is not None
    assert release is not None
    names = release.held.names[:-1]
    assert finding.verdict == "refuted"
    starts = [Start(state[:-1], state[-1]) for state in power_up_states(report.rhythm.system)]
    runs = simulator.run(bench, starts, 0, Reset(reset.port, reset.active, 40, watched=True))
    last: dict[int, list[tuple[int, ...]]] = {level: [] for level in (0, 1)}
    for run, start in zip(runs, starts, strict=True):
        last[start.clock].append(seen(report, run[40].values))
    differ = {
        name
        for here in last.values()
        for name, values in zip(names, zip(*here, strict=True), strict=True)
        if len(set(values)) > 1
    }
    assert set(release.held.unforced) == differ


def compare_too_short(report: Report, finding: Finding, bench: Bench, states: Sequence[State]) -> None:
    """Whether as many input cycles as are held lead all states to one."""
    reset, cycles = report.ports.reset, report.spec.reset_cycles
    assert reset is not None
    assert cycles is not None
    starts = [Start(state[:-1], state[-1]) for state in states]
    runs = simulator.run(bench, starts, 0, Reset(reset.port, reset.active, 2 * cycles))
    ways: dict[int, set[tuple[int, ...]]] = {level: set() for level in (0, 1)}
    for run, start in zip(runs, starts, strict=True):
        ways[start.clock].add(seen(report, run[0].values))
    assert (finding.verdict == "proved") == all(len(here) == 1 for here in ways.values())


def seen(report: Report, values: tuple[int, ...]) -> tuple[int, ...]:
    """The values of those registers that the output depends on."""
    release = report.rhythm.release
    assert release is not None
    registers = zip(report.ports.design.registers, values, strict=True)
    return tuple(value for register, value in registers if register.name in release.held.names)


def compare_holding(
    report: Report, finding: Finding, bench: Bench, states: Sequence[State]
) -> list[tuple[State, int]]:
    """How long reset needs at either level; the two states that it leaves, each with the output in it."""
    reset, release = report.ports.reset, report.rhythm.release
    assert reset is not None
    assert release is not None
    needs = finding.facts["shortest_reset_by_clock_level"]
    assert isinstance(needs, dict)
    assert release.held.unforced == ()
    long = max(needs.values()) + 4
    starts = [Start(state[:-1], state[-1]) for state in states]
    runs = simulator.run(bench, starts, 0, Reset(reset.port, reset.active, long, watched=True))
    left = []
    for level, name in ((0, "low"), (1, "high")):
        here = [run for run, start in zip(runs, starts, strict=True) if start.clock == level]
        ways = [len({seen(report, run[at].values) for run in here}) for at in range(long + 1)]
        assert ways[needs[name] :] == [1] * (long + 1 - needs[name])
        assert needs[name] == 0 or ways[needs[name] - 1] > 1
        last = here[0][long]
        left.append(((*last.values, level ^ long & 1), last.output))
    assert finding.facts["output_in_reset"] == (
        str(left[0][1]) if left[0][1] == left[1][1] else "not constant"
    )
    return left


def released(ports: Ports, bench: Bench, states: Sequence[State]) -> list[State]:
    """The states after a release: reset asserted and released again at once, in states in which it is held."""
    assert ports.reset is not None
    pulse = Reset(ports.reset.port, ports.reset.active, 0)
    runs = simulator.run(bench, [Start(state[:-1], state[-1]) for state in states], 0, pulse)
    return [(*run[0].values, state[-1]) for run, state in zip(runs, states, strict=True)]


def compare_edges(finding: Finding, runs: Mapping[int, Sequence[Run]]) -> None:
    for level, name in ((0, "low"), (1, "high")):
        at = 0
        edges: dict[str, int] = {}
        for index, (value, length) in enumerate(runs[level]):
            if index:
                edges.setdefault("rise" if value else "fall", (at + 1) // 2)
            at += length
        told = finding.facts[f"first_edges_released_{name}"]
        assert isinstance(told, dict)
        assert {verb: edges[verb] for verb in told} == told
        assert set(told) == set(edges) or len(runs[level]) < 4


def net_of_registers(ports: Ports) -> Iterator[str]:
    """Registers that another one clocks, clears or opens."""
    names = {register.name for register in ports.design.registers}
    for register in ports.design.registers:
        nets = [edge.clock for edge in register.edges] + [force.when for force in register.forces]
        if {v.name for v in e.variables(nets)} & names or register.kind != "flip-flop":
            yield register.name


def late_states(
    ports: Ports, before: State, freed: State, step: Map, output: Mapping[State, int]
) -> Iterator[tuple[State, tuple[int, int]]]:
    """The states in which one flip-flop has its reset value once more after the edge that follows the release; with
    the output before and after that edge."""
    assert ports.reset is not None
    after = step[freed]
    for place, register in enumerate(ports.design.registers):
        used = [x for edge in register.edges for x in (edge.clock, edge.data)]
        used += [force.when for force in register.forces]
        if ports.reset.port not in {v.name for v in e.variables(used)}:
            continue
        for bit in range(register.width):
            if (before[place] ^ after[place]) >> bit & 1:
                state = (*after[:place], after[place] ^ 1 << bit, *after[place + 1 :])
                yield state, (output[freed], output[state])
