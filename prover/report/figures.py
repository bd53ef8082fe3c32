"""What is drawn of a report: which signals, over which half-cycles. How it is drawn is for each report to say."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import ceil

from prover.facts import loop_orbits
from prover.findings import Counterexample, Report
from prover.report import words
from prover.report.wave import Drawing, Piece, Row, Timeline, plan, points_of_interest
from prover.rhythm import Orbit, Rhythm

SHORTEST = 16
"""Half-cycles drawn of a counterexample at least."""

MOST_REGISTERS = 12


@dataclass(frozen=True, slots=True)
class Extent:
    """How much is drawn, in half-cycles.

    most        of one wave, folds aside
    margin      before and after each point that matters
    least_fold  that are worth a fold; fewer are drawn"""

    most: int = 88
    margin: int = 6
    least_fold: int = 16


@dataclass(frozen=True, slots=True)
class Shown:
    """A wave in words, where it comes from, and an orbit that runs into it."""

    text: str
    causes: tuple[str, ...]
    orbit: Orbit


def waves(rhythm: Rhythm, most: int) -> list[Shown]:
    """The different waves of the start states; without these, those of the loops, at most so many."""
    causes: dict[str, list[str]] = {}
    shown: dict[str, Orbit] = {}
    for start, orbit in zip(rhythm.starts, rhythm.orbits, strict=True):
        adds = rhythm.accumulator
        text = words.of_orbit(orbit) if adds is None else words.of_accumulator(adds)
        causes.setdefault(text, []).append(start.cause)
        shown.setdefault(text, orbit)
    if not rhythm.starts:
        for orbit in loop_orbits(rhythm, most):
            text, wave = words.of_orbit(orbit), orbit.wave()
            count = sum(loop.wave == wave for loop in rhythm.loops)
            of_all = words.plural(len(rhythm.loops), "loop")
            causes[text] = ["the only loop" if len(rhythm.loops) == 1 else f"{count} of {of_all}"]
            shown[text] = orbit
    return [Shown(text, tuple(dict.fromkeys(causes[text])), orbit) for text, orbit in shown.items()]


def steady(report: Report, orbit: Orbit, extent: Extent) -> Drawing | None:
    """Clock and output from a rise on, under the numbers of the source edges that it falls on; twice round if
    that is short. None for a wave that isn't known or never changes."""
    wave, adds = orbit.wave(), report.rhythm.accumulator
    timeline = Timeline(orbit)
    if adds is not None:
        # Of a round that is not followed the first three gaps.
        begins, period = max(1, adds.worst), 3 * ceil(2 * adds.mean)
        edges = timeline.edges(begins, orbit.lead_half_cycles)
    elif wave is None or wave.period is None:
        return None
    else:
        period = wave.period
        edges = timeline.edges(max(1, timeline.lead), timeline.once + period + 1)
    rise = next(t for t in edges if timeline.level(t))
    rounds = 2 if period <= extent.most // 3 else 1
    ends = rise + rounds * period + 2
    if adds is not None:
        ends = min(ends, orbit.lead_half_cycles)
    points = points_of_interest(timeline, rise, ends, None)
    pieces = plan(rise, ends, points, extent.margin, extent.most, extent.least_fold)
    clock_high = timeline.state(rise)[-1]
    rows = (_clock_row(report, timeline), _output_row(report, timeline))
    return Drawing("edge", (1 if clock_high else 2) - rise, 1, rows, tuple(pieces))


def broken(report: Report, shown: Counterexample, extent: Extent) -> tuple[Drawing, int]:
    """Clock, output with what is broken marked, and the registers that matter, from the start on; and the number
    of registers left out."""
    timeline = Timeline(shown.orbit)
    ends = timeline.end(max(min(timeline.once, shown.ends + 2 * extent.most), shown.ends, SHORTEST) + 2)
    points = points_of_interest(timeline, 0, ends, (shown.begins, min(shown.ends, ends)))
    pieces = tuple(plan(0, ends, points, extent.margin, extent.most, extent.least_fold))
    output = replace(_output_row(report, timeline), marked=(shown.begins, shown.ends))
    registers, left = _registers_that_matter(report, timeline, pieces)
    rows = [_clock_row(report, timeline), output]
    rows += [_register_row(report, timeline, index) for index in registers]
    return Drawing("half-cycle", 0, 0, tuple(rows), pieces), left


def _clock_row(report: Report, timeline: Timeline) -> Row:
    return replace(_register_row(report, timeline, len(timeline.orbit.widths) - 1), counts=True)


def _output_row(report: Report, timeline: Timeline) -> Row:
    def steady(begins: int, ends: int) -> int | None:
        return timeline.steady(begins, ends)[-1:][0] if ends > begins else None

    return Row(report.ports.output, 1, timeline.level, steady)


def _register_row(report: Report, timeline: Timeline, index: int) -> Row:
    name, width = report.rhythm.system.variables[index]

    def steady(begins: int, ends: int) -> int | None:
        return timeline.steady(begins, ends)[index]

    return Row(name, width, lambda t: timeline.state(t)[index], steady)


def _registers_that_matter(
    report: Report, timeline: Timeline, pieces: Sequence[Piece]
) -> tuple[list[int], int]:
    """Registers other than the output itself, those that move where it is drawn before those that don't, and
    the number of those left out."""
    system = report.rhythm.system
    count = len(system.variables) - 1
    shown = [piece for piece in pieces if not piece.folded]
    states = [timeline.state(t) for piece in shown for t in range(piece.begins, piece.ends)]
    others = [i for i in range(count) if system.variables[i][0] != report.ports.output]
    moving = [i for i in others if len({state[i] for state in states}) > 1]
    chosen = [*moving, *(i for i in others if i not in moving)][:MOST_REGISTERS]
    return sorted(chosen), len(others) - len(chosen)
