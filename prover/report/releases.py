"""Reset in a test bench: held from a start state, released, and what the output does from then on.

Inputs move in the middle of half-cycles, so time after the release counts in halves of a half-cycle. No whole pulse
or gap may be shorter than the specified one; some time after the release none may be longer, either. Where it is the
start state or the length of the reset that the output hangs on, a second run tells: the output has to be the same.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping

from prover.findings import Finding, Report
from prover.release import UNITS, Freed, Release, pulses, same_output, start_registers
from prover.report import checks
from prover.report.checks import HALF_CYCLE, MOST_HALF_CYCLES
from prover.report.dut import Dut, NoBench, Scene, came, number, register
from prover.rhythm import Goal

ABOUT = (
    "From the start state it holds reset, releases it in the middle of a half-cycle, and measures the output from",
    "then on, in halves of a half-cycle: no whole pulse or gap may be shorter than the specified one, and from",
    "BEGINS on none longer.",
)
ABOUT_TWICE = (
    "Then it does the same once more from another start or with a longer reset, and compares the output."
)

PERIODS = 2
"""Output periods after the release within which a pulse or gap may be longer than the specified one."""


def scene(report: Report, finding: Finding, dut: Dut) -> Scene:
    """The release that refutes. Raises NoBench for a run in which other inputs move."""
    release, spec = report.rhythm.release, report.spec
    if release is None or finding.name != "reset":
        raise NoBench("inputs move in its run, and the only one that benches move is a reset")
    broken = finding.counterexample
    if broken is not None and any(freed.flop and freed.cause == broken.cause for freed in release.late):
        # No bench can release one flip-flop late; it can begin with what comes of that.
        return checks.scene(report, finding, dut)
    if spec.mean:
        raise NoBench("of a mean ratio no one pulse is known to be too short")
    freed = _shown(release, finding)
    goal = Goal(spec.period, spec.high_half_cycles)
    begins = PERIODS * UNITS * goal.period
    wrong = _first_wrong(freed, goal, begins)
    other = None if wrong else _other(release, freed)
    ends = begins + PERIODS * UNITS * goal.period
    if wrong:
        _, at, size = wrong
        ends = max(ends, at + size if size else max(at, begins) + UNITS * goal.period)
    length = max(ends, _parting(freed, other, ends)) + UNITS
    if length > MOST_HALF_CYCLES:
        raise NoBench(f"it would have to run for {length // UNITS} half-cycles after the release")
    reset = release.ports.reset
    assert reset is not None
    first = start_registers(release, freed)
    return Scene(
        start=f"reset held for {freed.held} half-cycles, and {freed.cause.removeprefix('reset ')}",
        about=[*ABOUT, *([ABOUT_TWICE] if other else [])],
        level=first[release.ports.clock],
        moving={reset.port: reset.active},
        parameters={"HALF_CYCLES": -(-length // UNITS), "BEGINS": begins},
        declarations=[
            *(register(name) for name in ("t", "began", "wanted")),
            "reg out, last, whole, run_again;",
            dut.shown,
            *([f"reg seen [0:{length + UNITS}];"] if other else []),
        ],
        code=[
            *_observation(goal, wrong, bool(other)),
            "",
            "initial begin",
            "  run_again = 1'b0;",
            *(f"  {line}" for line in _played(dut, release, freed)),
            *(
                ["  run_again = 1'b1;", *(f"  {line}" for line in _played(dut, release, other))]
                if other
                else []
            ),
            "  verdict;",
            "end",
        ],
        passed=("no pulse and no gap that is shorter, and then the specified wave", ""),
    )


def _shown(release: Release, finding: Finding) -> Freed:
    """The release that the finding shows, as a trace or by the run from then on."""
    trace, broken = finding.trace, finding.counterexample
    held = next((rest.half_cycle for rest in trace.rests if rest.moved), None) if trace else None
    for freed in release.runs:
        if freed.flop is not None:
            continue
        if (
            trace is None
            and broken is not None
            and freed.orbit is not None
            and freed.orbit.start == broken.orbit.start
        ):
            return freed
        if (
            trace is not None
            and freed.held == held
            and start_registers(release, freed) == dict(trace.rests[0].registers)
        ):
            return freed
    raise NoBench("it is none of the releases that were followed")


def _other(release: Release, freed: Freed) -> Freed:
    """A release at the same level of the clock after which the output is another one."""
    for each in release.on_time:
        if each.clock == freed.clock and same_output(each, freed) is False:
            return each
    raise NoBench("the output after it differs from no other release")


def _first_wrong(freed: Freed, goal: Goal, begins: int) -> tuple[int, int, int] | None:
    """The first pulse or gap that is too short, or from `begins` on too long (length 0): level, begin, length."""
    nominal = {level: UNITS * length for level, length in goal.pulses}
    lead, loop = (freed.orbit.lead_half_cycles, freed.orbit.loop_half_cycles) if freed.orbit else (0, 1)
    limit = begins + UNITS * (lead + 2 * loop + goal.period)
    at, level = 0, freed.before
    for pulse in pulses(freed, rounds=2 + limit // (UNITS * max(loop, 1))):
        if pulse.begins - max(at, begins) > nominal[level]:
            return level, at, 0
        if pulse.length < nominal[pulse.level]:
            return pulse.level, pulse.begins, pulse.length
        at, level = pulse.begins, pulse.level
        if at + pulse.length - max(at, begins) > nominal[level]:
            return level, at, 0
        if at > limit:
            return None
    # The last run never ends.
    wave = freed.orbit.wave() if freed.orbit else None
    return (1 - level if at else level, at, 0) if wave is not None and wave.stuck else None


def _parting(freed: Freed, other: Freed | None, limit: int) -> int:
    """The first half of a half-cycle after the release in which the output differs, 0 without another."""
    if other is None:
        return 0
    edges = [
        {(pulse.begins, pulse.level) for pulse in pulses(each, rounds=1 + limit)} for each in (freed, other)
    ]
    return min((begins for begins, _ in edges[0] ^ edges[1]), default=limit)


def _played(dut: Dut, release: Release, freed: Freed) -> Iterator[str]:
    """One release from the start on."""
    reset = release.ports.reset
    assert reset is not None
    registers, port = start_registers(release, freed), dut.local[reset.port]
    inputs: Mapping[str, int] = dict(release.ports.resetting.values)
    yield f"{port} = 1'b{reset.active};"
    yield f"{dut.clock} = 1'b{registers[release.ports.clock]};"
    yield "// The start state: forced so that nothing else reacts, then let go."
    yield from dut.set(registers, inputs)
    yield f"repeat ({freed.held}) #{HALF_CYCLE} {dut.clock} = ~{dut.clock};"
    yield f"#{HALF_CYCLE // UNITS};"
    yield "last = shown;"
    yield "{began, whole} = 0;"
    yield f"{port} = 1'b{1 - reset.active};"
    yield f"for (t = 0; t < {UNITS} * HALF_CYCLES && !failed; t = t + 1) begin"
    yield f"  if (t[0]) {dut.clock} = ~{dut.clock};"
    yield f"  #{HALF_CYCLE // UNITS};"
    yield "  observe;"
    yield "end"


def _observation(goal: Goal, wrong: tuple[int, int, int] | None, twice: bool) -> Iterator[str]:
    level, at, length = wrong or (0, 0, 0)
    lengths = {level: number(UNITS * size) for level, size in goal.pulses}
    same = f"last == {level} && began == {number(at)}" if wrong else "1'b0"
    halves = "%0d halves of a half-cycle"
    yield "// In the middle and at the end of each half-cycle."
    yield "task observe;"
    yield "  begin"
    yield "    out = shown;"
    yield "    if (out !== 1'b0 && out !== 1'b1 && !failed) begin"
    yield from came(f"an unknown output, {halves} after the release", "t", "1'b0", 6)
    yield "    end"
    yield f"    wanted = last ? {lengths[1]} : {lengths[0]};"
    yield "    if (out !== last && whole && t - began < wanted && !failed) begin"
    yield from came(
        f"a run at %b of {halves}, not %0d, from %0d after the release on",
        "last, t - began, wanted, began",
        f"{same} && t - began == {number(length)}",
        6,
    )
    yield "    end"
    yield "    if (out !== last) begin"
    yield "      began = t;"
    yield "      whole = 1'b1;"
    yield "    end"
    yield f"    wanted = out ? {lengths[1]} : {lengths[0]};"
    yield "    last = out;"
    yield "    if (t + 1 > BEGINS && t + 1 - (began > BEGINS ? began : BEGINS) > wanted && !failed) begin"
    yield from came(
        f"a run at %b of more than {halves}, from %0d after the release on",
        "last, wanted, began",
        "1'b0" if length else same,
        6,
    )
    yield "    end"
    if twice:
        yield "    if (run_again && out !== seen[t] && !failed) begin"
        yield from came(f"another output once more, {halves} after the release", "t", "1'b1", 6)
        yield "    end"
        yield "    seen[t] = out;"
    yield "  end"
    yield "endtask"
