"""Waves for a viewer: a counterexample as a value change dump, one time unit a half-cycle.

The dump covers the lead-in and once round the loop (or to the end of what is broken, if that is later), with
every register, the input clock, the output and what is held. Long stretches are elided: their first and last
half-cycles stand at their true times, and what moves in between is x meanwhile. A comment lists what is
elided. There is no date: the same input gives the same bytes. The format is that of IEEE 1364-2005 clause 18.
A trace whose inputs move has two time units a half-cycle: what moves in its middle is seen there. A glitch has one
for each thing that arrives at the output within the half-cycle.
"""

from __future__ import annotations

import io
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

from prover import __version__
from prover.arrival import Glitch
from prover.design import Design, components
from prover.findings import Counterexample, Finding, Report
from prover.report.wave import Piece, Timeline
from prover.settling import Unsettled
from prover.trace import Trace

END_SHOWN = 16
"""Half-cycles shown at either end of a stretch that is elided."""

MOST_SHOWN = 100_000
"""Half-cycles shown in one dump, which caps its size."""

MOST_LISTED = 32
"""Elided ranges that the comment lists; it counts the rest."""


@dataclass(frozen=True, slots=True)
class Dump:
    """A dump and the property whose counterexample it is."""

    name: str
    text: str


def dumps(report: Report) -> list[Dump]:
    """One dump for each finding that has a trace, in the order of the report."""
    return [Dump(f.name, text) for f in report.findings if (text := render(report, f)) is not None]


def render(report: Report, finding: Finding) -> str | None:
    """The finding's trace as a dump; None if it has none."""
    report = finding.witness or report
    if finding.trace is not None:
        return moves(report.ports.design, report.ports.clock, finding.name, finding.trace)
    if finding.counterexample is not None:
        return _orbit(report, finding.name, finding.counterexample)
    if finding.unsettled is not None:
        return _micro_steps(report, finding.name, finding.unsettled)
    if finding.glitch is not None:
        return _arrivals(report, finding.name, finding.glitch)
    return None


def moves(design: Design, clock: str, name: str, trace: Trace) -> str:
    """A run whose inputs move, two time units a half-cycle."""
    comment = [
        f"{name}: {trace.text}",
        f"start: {trace.cause}; two time units are one half-cycle of {clock}, the second after the inputs moved",
        f"broken from time {2 * trace.begins} to {2 * trace.ends}",
    ]
    inputs = [Variable(n, design.inputs[n], "wire") for n in trace.rests[0].inputs]
    widths = {r.name: r.width for r in design.registers} | {clock: 1}
    states = [Variable(n, widths[n], "wire" if n == clock else "reg") for n in trace.rests[0].registers]
    seen = [Variable(n, 1, "wire") for n in trace.rests[0].outputs if n not in widths]
    broken = (2 * trace.begins, 2 * trace.ends)
    file = File(design.top, [*inputs, *states, *seen], comment, broken=broken)
    for rest in trace.rests:
        named = {**rest.outputs, **rest.inputs, **rest.registers}
        time = 2 * rest.half_cycle + rest.moved
        file.put(time, [named[v.name] for v in (*inputs, *states, *seen)])
    return file.close(2 * trace.half_cycles)


def _orbit(report: Report, name: str, broken: Counterexample) -> str:
    timeline = Timeline(broken.orbit)
    # One input cycle more, so that the edge that ends what is broken is seen.
    ends = timeline.end(max(timeline.once, broken.ends) + 2)
    pieces = choose(timeline, ends, broken.begins, broken.ends)
    loop = f"{timeline.loop} half-cycles from time {timeline.lead} on" if timeline.loop else "not closed"
    comment = [
        f"{name}: {broken.text}",
        f"start: {broken.cause}; one time unit is one half-cycle of {report.ports.clock}",
        f"broken from time {broken.begins} to {broken.ends}; loop: {loop}",
        *elided([piece for piece in pieces if piece.folded]),
    ]
    file = _file(report, comment, (broken.begins, broken.ends))
    count = len(report.rhythm.system.variables) + _output_apart(report)
    for piece in pieces:
        if piece.folded:
            file.put(piece.begins, timeline.steady(piece.begins, piece.ends)[:count])
            continue
        for time in range(piece.begins, piece.ends):
            there = timeline.place(time)
            file.put(time, (*there.state, there.level)[:count])
    return file.close(ends)


def elided(folded: Sequence[Piece]) -> Iterator[str]:
    """What a dump's comment tells of the ranges that it leaves out."""
    for piece in folded[:MOST_LISTED]:
        yield f"elided: {piece.length} half-cycles, time {piece.begins} to {piece.ends}; what moves is x"
    if len(folded) > MOST_LISTED:
        yield f"elided: {len(folded) - MOST_LISTED} more ranges"


def choose(timeline: Timeline, ends: int, broken_from: int, broken_to: int) -> list[Piece]:
    """What is shown of the half-cycles up to `ends`: all but the middles of long stretches, and where that is
    still too much, the beginning, what is around the ends of the broken range, and the end."""
    windows: list[tuple[int, int]] | None = None
    if ends > MOST_SHOWN and _too_much(timeline, ends):
        part = MOST_SHOWN // 8
        around = [(at - part, at + part) for at in (part, broken_from, broken_to, ends - part)]
        windows = sorted((max(0, a), min(ends, b)) for a, b in around)
        return _windowed(timeline, ends, windows)
    return _merged(_span_by_span(timeline, 0, ends))


def _too_much(timeline: Timeline, ends: int) -> bool:
    """Whether the ends of all spans alone are more than what is shown."""
    shown = 0
    for length in timeline.regular(0, ends):
        shown += min(length, 2 * END_SHOWN)
        if shown > MOST_SHOWN:
            return True
    return False


def _span_by_span(timeline: Timeline, begins: int, ends: int) -> Iterator[Piece]:
    at = begins
    for length in timeline.regular(begins, ends):
        if length <= 4 * END_SHOWN:
            yield Piece(at, at + length)
        else:
            yield Piece(at, at + END_SHOWN)
            yield Piece(at + END_SHOWN, at + length - END_SHOWN, folded=True)
            yield Piece(at + length - END_SHOWN, at + length)
        at += length


def _merged(pieces: Iterator[Piece]) -> list[Piece]:
    """Neighbouring pieces that are shown, joined."""
    out: list[Piece] = []
    for piece in pieces:
        if out and not out[-1].folded and not piece.folded:
            out[-1] = Piece(out[-1].begins, piece.ends)
        else:
            out.append(piece)
    return out


def _windowed(timeline: Timeline, ends: int, windows: Sequence[tuple[int, int]]) -> list[Piece]:
    pieces: list[Piece] = []
    at = 0
    for begins, upto in windows:
        if at < begins:
            pieces.append(Piece(at, begins, folded=True))
        if max(at, begins) < upto:
            pieces += _span_by_span(timeline, max(at, begins), upto)
        at = max(at, upto)
    if at < ends:
        pieces.append(Piece(at, ends, folded=True))
    return _merged(iter(pieces))


def _micro_steps(report: Report, name: str, unsettled: Unsettled) -> str:
    """Twice through the round of micro-steps that never ends, one time unit each."""
    when = "with no clock edge" if unsettled.power_up else "at a clock edge"
    count = len(unsettled.cycle)
    comment = [
        f"{name}: {count} micro-steps that repeat for ever {when}",
        "one time unit is one micro-step: no time passes between them",
    ]
    file = _file(report, comment)
    system = report.rhythm.system
    count = len(system.variables) + _output_apart(report)
    shown = [*unsettled.cycle, *unsettled.cycle][:MOST_SHOWN]
    for time, state in enumerate(shown):
        file.put(time, (*state, system.out(state))[:count])
    return file.close(len(shown))


def _arrivals(report: Report, name: str, glitch: Glitch) -> str:
    """What arrives at the output within one half-cycle, one time unit each, after one in which all is at rest."""
    design = report.ports.design
    comment = [
        f"{name}: the output pulses at the {glitch.edge} edge of {report.ports.clock}",
        "one time unit is one arrival: all of them are within a half-cycle, in an order that shows the pulse",
        f"broken from time {glitch.first + 1}",
    ]
    widths = {r.name: r.width for r in design.registers}
    seen = [
        Variable(n, widths.get(n, 1), "reg" if n in widths else "wire")
        for n in glitch.arrivals[0].seen
        if n != report.ports.output
    ]
    output = Variable(report.ports.output, 1, "wire")
    file = File(design.top, [*seen, output], comment, broken=(glitch.first + 1, glitch.back + 1))
    file.put(0, [*(glitch.state.get(v.name) for v in seen), glitch.level])
    for time, arrival in enumerate(glitch.arrivals, 1):
        file.put(time, [*(arrival.seen[v.name] for v in seen), arrival.level])
    return file.close(len(glitch.arrivals) + 1)


# -- the file ----------------------------------------------------------------------------------------------


def _output_apart(report: Report) -> bool:
    """Whether the output is no register under its own name, which would be declared twice."""
    return report.ports.output not in report.rhythm.system.names


def _file(report: Report, comment: Sequence[str], broken: tuple[int, int] | None = None) -> File:
    """A dump of the registers, the clock, the output where it stands apart, and every input that is held."""
    system, ports = report.rhythm.system, report.ports
    kinds = ["reg"] * (len(system.variables) - 1) + ["wire"]
    moving = [Variable(n, w, kind) for (n, w), kind in zip(system.variables, kinds, strict=True)]
    if _output_apart(report):
        moving.append(Variable(ports.output, 1, "wire"))
    held = [(Variable(n, ports.design.inputs[n], "wire"), value) for n, value in ports.running.values]
    return File(ports.design.top, moving, comment, held, broken)


@dataclass(frozen=True, slots=True)
class Variable:
    """A variable of a dump: its name with its scopes, its width, and the kind that viewers show."""

    name: str
    width: int
    kind: str


class File:
    """A dump being written: variables that `put` gives values, and others that are held at one.

    `broken` is from when to when (exclusive) the claim is, in time units: a wire of that name is 1 there, since few
    viewers show comments."""

    def __init__(
        self,
        top: str,
        moving: Sequence[Variable],
        comment: Sequence[str],
        held: Sequence[tuple[Variable, int]] = (),
        broken: tuple[int, int] | None = None,
    ) -> None:
        from vcd import VCDWriter

        self._text = io.StringIO()
        self._writer = VCDWriter(
            self._text,
            timescale="1 ns",
            date="",
            comment="\n".join(_plain(line) for line in comment),
            version=f"Subharmonic {__version__}",
        )
        self._taken: set[tuple[str, ...]] = set()
        self._top = _word(top)
        self._variables = [self._declare(variable) for variable in moving]
        for variable, value in held:
            self._declare(variable, value)
        self._marks: list[tuple[int, int]] = []
        if broken is not None:
            # Last, so that a name of the design's stays as it is.
            self._broken = self._declare(Variable("broken", 1, "wire"), 0)
            self._marks = [(broken[0], 1), (max(broken[1], broken[0] + 1), 0)]

    def _declare(self, variable: Variable, value: int | None = None) -> Any:
        *scopes, last = [_word(part + index) for part, index in components(variable.name)]
        path = (self._top, *scopes, last)
        count = 1
        while path in self._taken:
            count += 1
            path = (self._top, *scopes, f"{last}_{count}")
        self._taken.add(path)
        init = "x" if value is None else value
        return self._writer.register_var(path[:-1], path[-1], variable.kind, size=variable.width, init=init)

    def put(self, time: int, values: Sequence[int | None]) -> None:
        """The values of the variables from a time on; None is x."""
        self._mark(time)
        for variable, value in zip(self._variables, values, strict=True):
            self._writer.change(variable, time, "x" if value is None else value)

    def _mark(self, time: int) -> None:
        """Where the claim begins and ceases to be broken, up to a time."""
        while self._marks and self._marks[0][0] <= time:
            self._writer.change(self._broken, *self._marks.pop(0))

    def close(self, time: int) -> str:
        self._mark(time)
        self._writer.close(time)
        return self._text.getvalue()


def _plain(text: str) -> str:
    """Text that can stand in a comment: ASCII, one line, no keyword that would end it."""
    return text.encode("ascii", "backslashreplace").decode("ascii").replace("\n", " ").replace("$", "")


def _word(name: str) -> str:
    """A name that every reader takes as one word; what a dump can't hold is replaced by underscores."""
    kept = "".join(c if "!" <= c <= "~" and c != "$" else "_" for c in name)
    return kept or "_"
