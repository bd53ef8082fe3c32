"""Inputs that move in a test bench: driven as in a trace, and every pulse of the output measured.

A pulse counts as short as the whole half-cycles in it, and as long as those that it reaches into, for a move may come
anywhere in its half-cycle. The nominal lengths are those of the values that the inputs have had so far.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

from prover.domain import claimed_at, fixed_values
from prover.findings import Finding, Report
from prover.report.checks import HALF_CYCLE, reset_first
from prover.report.dut import Dut, NoBench, Scene, came, number, register, word
from prover.trace import Rest

ABOUT = (
    "From the start state it moves the inputs as in the report, and measures each pulse of the output: none may be",
    "shorter than the shortest nominal one of the inputs' values so far, or longer than the longest.",
)
ABOUT_ENABLE = (
    "From the start state it moves the input as in the report, and measures each pulse of the output: none may be",
    "shorter than the nominal one.",
)

Lengths = tuple[int, int]
"""Half-cycles of the low and the high pulse."""


def scene(report: Report, finding: Finding, dut: Dut) -> Scene:
    """The run that refutes. Raises NoBench where it shows what goes on for ever."""
    trace = finding.trace
    assert trace is not None
    if trace.on_the_way:
        raise NoBench("what its run shows lies within a half-cycle, where a simulator knows no delays")
    if trace.text.startswith("the output"):
        raise NoBench("what its run shows goes on for ever")
    first, varies = trace.rests[0], finding.name == "ratio-change"
    names = [name for name in report.spec.moving if name in first.inputs]
    reset = report.ports.reset if report.rhythm.scope == "reset" and report.rhythm.starts else None
    return Scene(
        start=trace.cause,
        about=ABOUT if varies else ABOUT_ENABLE,
        level=first.registers[report.ports.clock],
        moving={name: first.inputs[name] for name in [*names, *([reset.port] if reset else [])]},
        declarations=[
            *(register(name) for name in ("t", "began")),
            "reg out, last, seen, odd, moved;",
            "reg [63:0] shortest [0:1], longest [0:1];",
            dut.shown,
        ],
        code=[
            *_observation(varies),
            "",
            "initial begin",
            "  {t, began, seen, odd, moved} = 0;",
            *(f"  {line}" for line in (reset_first(report, dut) if reset else ())),
            *(f"  {line}" for line in _played(report, dut, trace.rests, names)),
            "  verdict;",
            "end",
        ],
        passed=("no pulse that is too short" + " or too long" * varies, ""),
    )


def _lengths(report: Report, inputs: Mapping[str, int]) -> Lengths:
    """The nominal pulses for these values of the inputs."""
    spec = report.spec
    claimed = claimed_at(spec, {**fixed_values(report.ports.design, spec), **inputs})
    return claimed.period - claimed.high_half_cycles, claimed.high_half_cycles


def _played(report: Report, dut: Dut, rests: Sequence[Rest], names: Sequence[str]) -> Iterator[str]:
    first = rests[0]
    seen = [_lengths(report, first.inputs)]
    yield "// The start state: forced so that nothing else reacts, then let go."
    yield from dut.set(first.registers, first.inputs)
    yield from _limits(seen)
    yield f"#{HALF_CYCLE // 2};"
    yield "last = shown;"
    at, spent = 0, HALF_CYCLE // 2
    for rest in rests[1:]:
        while at < rest.half_cycle:
            yield f"#{HALF_CYCLE - spent} {dut.clock} = ~{dut.clock};"
            at, spent = at + 1, HALF_CYCLE // 4
            yield f"t = {number(at)};"
            yield f"#{HALF_CYCLE // 4} moved = 1'b0;"
            yield "observe;"
        if rest.moved:
            for name in names:
                yield f"{dut.local[name]} = {word(dut.design.inputs[name], rest.inputs[name])};"
            seen.append(_lengths(report, rest.inputs))
            yield from _limits(seen)
            yield f"#{HALF_CYCLE // 4} moved = 1'b1;"
            spent += HALF_CYCLE // 4
            yield "observe;"


def _limits(seen: Sequence[Lengths]) -> Iterator[str]:
    for level in (0, 1):
        yield f"shortest[{level}] = {number(min(each[level] for each in seen))};"
        yield f"longest[{level}] = {number(max(each[level] for each in seen))};"


def _observation(varies: bool) -> Iterator[str]:
    yield "// When all is at rest after an edge, or after a move."
    yield "task observe;"
    yield "  begin"
    yield "    out = shown;"
    yield "    if (out !== 1'b0 && out !== 1'b1 && !failed) begin"
    yield from came("an unknown output in half-cycle %0d", "t", "1'b0", 6)
    yield "    end"
    yield "    if (out !== last && seen && t - began < shortest[last] + odd && !failed) begin"
    yield from came(
        "a pulse at %b with %0d whole half-cycles in it, not %0d, from half-cycle %0d on",
        "last, t > began ? t - began - odd : 0, shortest[last], began",
        "1'b1",
        6,
    )
    yield "    end"
    if varies:
        yield "    if (out === last && seen && !moved && t - began >= longest[last] && !failed) begin"
        yield from came(
            "a pulse at %b that goes on after %0d half-cycles, from half-cycle %0d on",
            "last, longest[last], began",
            "1'b1",
            6,
        )
        yield "    end"
    yield "    if (out !== last) begin"
    yield "      began = t;"
    yield "      odd = moved;"
    yield "      seen = 1'b1;"
    yield "    end"
    yield "    last = out;"
    yield "  end"
    yield "endtask"
