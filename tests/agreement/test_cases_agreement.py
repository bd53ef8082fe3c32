"""Every case of up to 12 register bits in the event simulator (Icarus Verilog), from every power-up state.

Registers and output have to be System's at the end of each of 200 half-cycles, and the verdict's figures those that
plain enumeration finds on the simulator's own map. Self-clearing loops have one unit of delay at the gates that the
case names, because every simulator orders in its own way what it does at one moment. Where the verdict is that the
outcome hangs on the order of simultaneous events, no one order is the right one, and nothing is compared.
"""

from __future__ import annotations

import shlex
from collections.abc import Mapping
from dataclasses import replace
from fractions import Fraction
from pathlib import Path
from typing import Any

import pytest
from agreement import brute, simulator
from agreement.simulator import Bench, Reset, SimulatorError, Start
from agreement.stepping import differences, power_up_states, simulated_registers
from cases_format import Case, Group, cases

from prover import cli, questions
from prover.api import check, read
from prover.domain import Domain, claimed_at
from prover.errors import UserError
from prover.findings import Report
from prover.ports import Ports
from prover.spec import Spec
from prover.system import State

MOST_BITS = 12
HALF_CYCLES = 200


def spec_of(group: Group) -> Spec:
    """The claim that the command line makes of the group's options."""
    context = cli.check.make_context("check", ["case.v", *group.options])
    files_apart = {
        name: value for name, value in context.params.items() if name not in ("files", "json_path")
    }
    return cli._spec(files_apart)


def register_bits(case: Case, group: Group) -> int:
    try:
        return read([case.path], spec_of(group)).state_bits
    except UserError:
        # It is the case's own test that fails, not the collection of all.
        return 0


def small(settles: bool) -> list[Any]:
    """The groups with up to 12 register bits, of machines that settle or of those that don't."""
    out = []
    for case in cases():
        for group in case.groups:
            hangs_on_order = len(group.properties) > 1 and group.properties["settling"].verdicts == {
                "refuted"
            }
            if group.error or hangs_on_order or (len(group.properties) > 1) != settles:
                continue
            if register_bits(case, group) <= MOST_BITS:
                out.append(pytest.param(case, group, id=f"{case.name}: {shlex.join(group.options)}"))
    return out


SETTLING, UNSETTLED = small(True), small(False)


def bench_of(case: Case, ports: Ports, spec: Spec) -> Bench:
    return Bench(
        sources=[case.path],
        top=ports.design.top,
        clock=ports.clock,
        output=spec.output or ports.output,
        registers=simulated_registers(ports.design),
        holds=dict(ports.running.values),
        parameters=spec.parameters,
        delayed=case.delayed,
        defines=spec.defines,
        includes=[Path(folder) for folder in spec.include],
    )


def test_most_cases_are_small_enough() -> None:
    stated = sum(not group.error for case in cases() for group in case.groups)
    assert len(SETTLING) + len(UNSETTLED) > 0.8 * stated


@pytest.mark.parametrize(("case", "group"), SETTLING)
def test_the_simulator_steps_and_recovers_as_the_verdict_says(case: Case, group: Group) -> None:
    for spec in in_numbers(case, spec_of(group)):
        compare(case, spec)


def in_numbers(case: Case, spec: Spec) -> list[Spec]:
    """The claim itself; of a claim for each value of some inputs, those at the first, a middle and the last one.
    Inputs that move stand still here: an enable at 1, those of the ratio as with --each."""
    if spec.moving:
        spec = questions.named_ports(read([case.path], spec), spec)
    formula = spec.ratio_formula
    varying = {n: v for n, v in spec.moving.items() if formula is not None and n in formula.names}
    enables = {name: 1 for name in spec.moving if name not in varying}
    spec = replace(spec, moving={}, each={**spec.each, **varying}, holds={**spec.holds, **enables})
    if not spec.each:
        return [spec]
    design = read([case.path], spec)
    domain = Domain.of(design, spec)
    values = list(domain.values())
    chosen = [values[0], values[len(values) // 3], values[-1]]
    return [claimed_at(spec, {**domain.fixed, **value}, value) for value in chosen]


def compare(case: Case, spec: Spec) -> None:
    report = check([case.path], spec)
    system = report.rhythm.system
    assert not system.choices
    states = power_up_states(system)
    bench = bench_of(case, report.ports, spec)
    told, step, output = differences(system, bench, states, HALF_CYCLES)
    assert not told, "\n".join(told[:5])
    assert set(step.values()) <= set(states)
    compare_figures(report, enumerated(spec, step, output))
    if report.rhythm.scope != "any" and not report.rhythm.starts:
        # What reset leaves is said to be unknown because nothing settles under it: nor does the simulator.
        with pytest.raises(SimulatorError, match="took more than"):
            released_states(report, bench, states, timeout_seconds=3)
    elif report.rhythm.scope != "any":
        compare_starts(report, bench, states, step, output)


def enumerated(
    spec: Spec, step: Mapping[State, State], output: Mapping[State, int]
) -> brute.BruteResult[State]:
    if not spec.mean:
        return brute.analyse(step, output, spec.period, spec.high_half_cycles)
    waves = [tuple(output[state] for state in loop) for loop in brute.find_loops(step)]
    meant = [wave for wave in waves if brute.has_mean(wave, spec.ratio or Fraction())]
    if spec.high is not None:
        meant = [wave for wave in meant if high_runs(wave) == {spec.high}]
    # A wave that no machine shows, where none has the mean.
    return brute.analyse_wave(step, output, meant[0] if meant else (2,))


def compare_figures(report: Report, found: brute.BruteResult[State]) -> None:
    rhythm, recovery = report.rhythm, report.rhythm.recovery
    assert rhythm.complete
    ours = [(a.length, a.wave.period, a.wave.high, a.good) for a in rhythm.loops]
    theirs = [(len(b.states), b.period_half_cycles, b.high_half_cycles, b.good) for b in found.loops]
    assert sorted(ours, key=str) == sorted(theirs, key=str)
    assert recovery is not None
    assert recovery.worst == found.worst_half_cycles
    assert recovery.illegal == (
        None if recovery.illegal is None else sum(time != 0 for time in found.recovery_half_cycles.values())
    )
    if found.lost_states:
        assert recovery.lost is not None
        assert recovery.lost.start in found.lost_states
    else:
        assert recovery.exact
        assert recovery.slowest is not None
        assert found.recovery_half_cycles[recovery.slowest] == found.worst_half_cycles
    verdicts = {finding.name: finding.verdict for finding in report.findings}
    assert verdicts["no-stuck"] == ("refuted" if found.stuck else "proved")
    within, worst = report.spec.within, found.worst_half_cycles
    late = worst is None or (within is not None and worst > within)
    assert verdicts["recovery"] == ("refuted" if late else "proved")
    if rhythm.scope == "any":
        gaps = all(has_ratio(report.spec, loop.wave) for loop in found.loops)
        assert verdicts["ratio"] == ("proved" if gaps else "refuted")
        if "high-time" in verdicts:
            runs = all(high_runs(loop.wave) == {report.spec.high_half_cycles} for loop in found.loops)
            assert verdicts["high-time"] == ("proved" if runs else "refuted")


def has_ratio(spec: Spec, wave: tuple[int, ...]) -> bool:
    """Whether the gaps of an endlessly repeated wave are as they are claimed to be."""
    if spec.mean:
        return brute.has_mean(wave, spec.ratio or Fraction())
    return set(brute.rise_gaps(wave)) == {spec.period}


def high_runs(wave: tuple[int, ...]) -> set[int]:
    """The lengths of its high runs."""
    return {next(n for n in range(1, len(wave)) if not wave[(i + n) % len(wave)]) for i in brute.rises(wave)}


def compare_starts(
    report: Report,
    bench: Bench,
    states: list[State],
    step: Mapping[State, State],
    output: Mapping[State, int],
) -> None:
    """The states that reset or initial values leave, and the waves from there, at both levels of the clock."""
    rhythm, spec = report.rhythm, report.spec
    first = initial_states(bench) if rhythm.scope == "initial" else released_states(report, bench, states)
    assert {state[-1] for state in first} == {0, 1}
    orbits = dict(zip((start.state for start in rhythm.starts), rhythm.orbits, strict=True))
    assert first == set(orbits)
    right = {"ratio": True, "high-time": True}
    for state, orbit in orbits.items():
        path = [state]
        while len(path) < orbit.lead_half_cycles + 2 * orbit.loop_half_cycles:
            path.append(step[path[-1]])
        levels = [level for level, length in orbit.runs(rounds=2) for _ in range(length)]
        assert levels == [output[at] for at in path]
        (loop,) = brute.find_loops({at: step[at] for at in path})
        round_ = brute.BruteLoop(loop, tuple(output[at] for at in loop), good=False)
        wave = orbit.wave()
        assert wave is not None
        assert (wave.period, wave.high) == (round_.period_half_cycles, round_.high_half_cycles)
        right["ratio"] &= has_ratio(spec, round_.wave)
        if not spec.mean or spec.high is not None:
            right["high-time"] &= high_runs(round_.wave) == {spec.high_half_cycles}
    # None of the cases has a wrong pulse on the way from its start to its loop only.
    for finding in report.findings:
        if finding.name in right:
            assert finding.verdict == ("proved" if right[finding.name] else "refuted")


def initial_states(bench: Bench) -> set[State]:
    """The declared initial values at either level of the clock. A clock that is high from the first moment has risen
    from x there, as far as the simulator is concerned; so the values are read under a low clock and set again."""
    values = simulator.run_initial(bench, 0, 0)[0].values
    starts = [Start(values, clock) for clock in (0, 1)]
    runs = simulator.run(bench, starts, 0)
    return {(*samples[0].values, start.clock) for start, samples in zip(starts, runs, strict=True)}


def released_states(
    report: Report, bench: Bench, states: list[State], timeout_seconds: float = 120.0
) -> set[State]:
    """The states just after reset was held for long enough, from every power-up state, and released."""
    reset, held = report.ports.reset, report.rhythm.reset_half_cycles
    assert reset is not None
    assert held is not None
    # Registers that the output does not depend on may take longer to be forced.
    pulse = Reset(reset.port, reset.active, held + held % 2 + 8)
    starts = [Start(state[:-1], state[-1]) for state in states]
    runs = simulator.run(bench, starts, 0, pulse, timeout_seconds)
    # After an even number of half-cycles the clock is where it began.
    return {(*samples[0].values, start.clock) for start, samples in zip(starts, runs, strict=True)}


@pytest.mark.parametrize(("case", "group"), UNSETTLED)
def test_the_simulator_does_not_settle_either(case: Case, group: Group) -> None:
    spec = spec_of(group)
    report = check([case.path], spec)
    assert report.rhythm.settling.unsettled is not None
    bench = bench_of(case, report.ports, spec)
    with pytest.raises(SimulatorError, match="took more than"):
        simulator.run(bench, list(simulator.every_state(bench.registers)), 2, timeout_seconds=3)
