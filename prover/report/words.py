"""The words that reports for people share: the same thing is told alike on a terminal and on a page."""

from __future__ import annotations

from collections.abc import Iterator
from fractions import Fraction
from itertools import pairwise
from math import ceil, floor
from typing import TYPE_CHECKING

from prover.arrival import Glitch
from prover.each import ValueRow, row_text
from prover.facts import number
from prover.findings import Fact, Finding, Report
from prover.rhythm import Loop, Orbit, Rhythm, Wave
from prover.system import State

if TYPE_CHECKING:
    from prover.accumulator import Accumulator

MOST_RUNS = 8
"""Runs of a wave that are spelt out."""

MOST_NAMED = 8
"""Registers that are named of those with one depth of their clock."""


def plural(count: int, noun: str) -> str:
    """The noun with its number: 1 loop, 2 loops."""
    return f"{count} {noun}{'s' * (count != 1)}"


def digits(value: int) -> str:
    """A number with its digits in threes."""
    return f"{value:,}".replace(",", " ")


def origin(rhythm: Rhythm) -> str:
    """Where the ratio is claimed from."""
    if rhythm.scope == "any":
        return "from every power-up state"
    if rhythm.scope == "initial":
        return "from the declared initial values"
    held = rhythm.reset_half_cycles
    return "from reset" + (f" held for {plural(held, 'half-cycle')} or longer" if held else "")


def claim(report: Report) -> str:
    """What is claimed of the wave, in one sentence; "" for a measurement."""
    told = _claimed(report)
    moving = " and ".join(report.spec.moving)
    return f"{told}; and while {moving} move{'s' * (len(report.spec.moving) == 1)}" if moving else told


def _claimed(report: Report) -> str:
    spec = report.spec
    if spec.ratio is None:
        return ""
    within = f", recovery within {spec.within} half-cycles" if spec.within is not None else ""
    if report.each is not None:
        each = report.each
        high = (
            f", high {each.high} half-cycles" if each.high else ", high for half the period" * (not spec.mean)
        )
        mean = " on average" if spec.mean else ""
        told = f"divide by {each.ratio}{mean}{high}, {origin(report.rhythm)}{within}"
        return f"{told}, for each of {each.domain}"
    if spec.mean:
        high = f": high {plural(spec.high, 'half-cycle')}" if spec.high is not None else ""
        return f"divide by {spec.ratio_text} on average{high}, {origin(report.rhythm)}{within}"
    wave = f"period {spec.period} half-cycles, high {spec.high_half_cycles}"
    return f"divide by {spec.ratio_text}: {wave}, {origin(report.rhythm)}{within}"


def values(row: ValueRow) -> tuple[str, str, str]:
    """A row of values: the values, the ratios that are claimed of them, and what is wrong or the worst recovery."""
    first, last = map(number, row.ratios)
    judged = ((row.refuted, "refuted"), (row.open, "open"))
    told = [f"{', '.join(names)} {word}" for names, word in judged if names]
    if not told and row.worst is not None:
        told.append(f"worst recovery {plural(row.worst, 'half-cycle')}")
    return row_text(row), f"ratio {first}" + (f" to {last}" if first != last else ""), "; ".join(told)


def fact(value: Fact) -> str:
    """A fact as text: names with their values, or a list."""
    if isinstance(value, dict):
        return "  ".join(f"{name}={number}" for name, number in value.items())
    if isinstance(value, list):
        return ", ".join(str(item) for item in value)
    return str(value)


FACTS = (
    ("if_the_edge_won", "if the edge won"),
    ("if_late", "if late"),
    ("output_in_reset", "output in reset"),
    ("first_edges_released_low", "edges after a release while the clock is low"),
    ("first_edges_released_high", "edges after a release while the clock is high"),
    ("slowest_state", "slowest"),
    ("state", "state"),
    ("illegal_states", "illegal power-up states"),
)
"""Facts of findings that people are told, by the names that they read."""


def facts_of(finding: Finding) -> Iterator[tuple[str, list[str]]]:
    """A finding's facts that its words don't say already: a name and what it is, in several parts where it is
    several things."""
    for key, name in FACTS:
        value = finding.facts.get(key)
        if value not in (None, "", [], {}):
            yield name, [str(item) for item in value] if isinstance(value, list) else [fact(value)]


def facts(report: Report) -> Iterator[tuple[str, str]]:
    """The facts that a report carries: a name, and what it is with its unit."""
    found = report.facts
    edges = found.get("source_edges")
    if isinstance(edges, list):
        text = f"on source edges {', '.join(map(str, edges))} (edge 1 rises)"
        if found.get("source_edges_alternate"):
            text += "; every other period begins on the other edge, so its length is constant only at d = 0.5"
        yield "rise, fall and next rise", text
    if "duty" in found:
        text = f"{found['duty']} of a source of duty d: {found['duty_at_half']} at d = 0.5"
        if "duty_range" in found and report.spec.source_duty is not None:
            low, high = (number(end) for end in report.spec.source_duty)
            text += f", {found['duty_range']} for a source of {low} to {high} %"
        yield "duty", text
    pulses = ((level, found.get(f"shortest_{level}_half_cycles")) for level in ("high", "low"))
    told = [f"{plural(length, 'half-cycle')} {level}" for level, length in pulses if isinstance(length, int)]
    if told:
        yield "shortest pulse", ", ".join(told)
    yield from _clock_depth(report)
    worst = found.get("worst_recovery_half_cycles")
    if worst is not None:
        cycles = found["worst_recovery_input_cycles"]
        text = f"{worst} half-cycles, {cycles} input cycle{'s' * (cycles != '1')}"
        if "worst_recovery_seconds" in found:
            text += f", {found['worst_recovery_seconds']}"
        yield "worst recovery", text


def _clock_depth(report: Report) -> Iterator[tuple[str, str]]:
    """The registers by how many others their clock comes through, where there are any that do."""
    depth = report.facts.get("clock_depth")
    if not isinstance(depth, dict) or not any(depth.values()):
        return
    levels: dict[int, list[str]] = {}
    for name, level in depth.items():
        levels.setdefault(level, []).append(name)
    told = []
    for level, names in sorted(levels.items()):
        more = f" and {len(names) - MOST_NAMED} more" if len(names) > MOST_NAMED else ""
        told.append(f"{level} {', '.join(names[:MOST_NAMED])}{more}")
    yield f"registers between {report.ports.clock} and their clock:", "; ".join(told)


def state(report: Report, values: State) -> str:
    """A state of the report's machine: register and clock values by name."""
    return fact(dict(report.rhythm.system.describe(values)))


def glitch_table(report: Report, glitch: Glitch, most: int) -> list[list[str]]:
    """What arrives at the output, a row each under a row of headings: when, what, the output, and the values of the
    words that it is made of, at most so many, those first that change."""
    words: dict[str, None] = {}
    before = {name: value for name, value in glitch.state.items() if name in glitch.arrivals[0].seen}
    rows = [before, *(arrival.seen for arrival in glitch.arrivals)]
    for then, now in pairwise(rows):
        words |= dict.fromkeys(name for name in now if then.get(name, now[name]) != now[name])
    words |= dict.fromkeys(rows[-1])
    shown = [name for name in words if name != report.ports.output][:most]
    table = [["micro-step", "arrives", report.ports.output, *shown]]
    table.append(["", "before", str(glitch.level), *(str(before.get(name, "")) for name in shown)])
    for arrival in glitch.arrivals:
        moved = f"{arrival.name} {arrival.old}→{arrival.new}"
        values = (str(arrival.seen[name]) for name in shown)
        table.append([str(arrival.micro_step), moved, str(arrival.level), *values])
    return table


def of_orbit(orbit: Orbit) -> str:
    """The wave that an orbit runs into, or why it isn't known."""
    wave = orbit.wave()
    if wave is None:
        return f"not known: {orbit.why}" if orbit.why else "a round of too many runs to write out"
    return of_wave(wave)


def of_accumulator(found: Accumulator) -> str:
    """The wave of a round that is too long to follow."""
    goal, gaps = found.goal, sorted({2 * floor(found.mean), 2 * ceil(found.mean)})
    count = Fraction(goal.period, 2) / found.mean
    highs = sorted(set(found.runs(1)))
    told = [" or ".join(map(str, lengths)) for lengths in (gaps, highs)]
    return (
        f"period {goal.period} half-cycles with {count} pulses: gaps of {told[0]} half-cycles, high {told[1]}"
    )


def of_wave(wave: Wave) -> str:
    """A wave's ratio, period and high time in half-cycles, or its pattern where it has several pulses."""
    if wave.stuck:
        return f"the output stays {wave.runs[0][0]}"
    told = f"period {wave.period} half-cycles"
    if len(wave.runs) > 2:
        return f"{told} with {len(wave.runs) // 2} pulses, high {wave.high}: {_pattern(wave)}"
    return f"divides by {number(Fraction(wave.period or 0, 2))}: {told}, high {wave.high}"


def _pattern(wave: Wave) -> str:
    runs = [f"{'high' if level else 'low'} {length}" for level, length in wave.runs[:MOST_RUNS]]
    return ", ".join(runs) + (", …" if len(wave.runs) > MOST_RUNS else "")


def loop_kind(loop: Loop, rhythm: Rhythm) -> str:
    """What a loop is, in a word: stuck, good, not good; "" where nothing says what good is."""
    if loop.stuck or loop.good:
        return "stuck" if loop.stuck else "good"
    known = any(each.good for each in rhythm.loops) or rhythm.recovery is not None
    return "not good" if known else ""
