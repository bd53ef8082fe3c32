"""The report that people read: what was read, claimed and found, with waves drawn against the clock.

Plain text first, so that it reads the same in a pipe; colour only underlines the verdict words. The same
input gives the same text, but for the last line, which says how long it took.
"""

from __future__ import annotations

import re
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction

from prover.facts import LIMITS, loop_orbits, number
from prover.findings import Counterexample, Fact, Finding, Report
from prover.output import harmless
from prover.report.trace import drawing
from prover.report.wave import (
    ASCII,
    UNICODE,
    Drawing,
    Piece,
    Row,
    Style,
    Timeline,
    draw,
    plan,
    points_of_interest,
)
from prover.rhythm import Loop, Orbit, Rhythm, Wave
from prover.settling import Unsettled
from prover.system import State
from prover.trace import Trace

WIDTH = 100
"""Characters a line: fixed, so that the report does not hang on the window it is shown in."""

MOST_COLUMNS = 88
"""Half-cycles drawn of one wave, folds aside."""

MARGIN = 6
"""Half-cycles drawn before and after each point that matters."""

LEAST_FOLD = 16
"""Half-cycles that are worth a fold; fewer are drawn."""

SHORTEST = 16
"""Half-cycles drawn of a counterexample at least."""

MOST_WAVES = 3
MOST_LOOPS = 20
MOST_REGISTERS = 12
MOST_RUNS = 8

COLOURS = {"PROVED": "32", "MEASURED": "32", "REFUTED": "31", "OPEN": "33", "WAIVED": "33"}

ASCII_TEXT = str.maketrans({"‾": "~", "…": "...", "µ": "u", "·": "*", "−": "-", "÷": "/", "→": "->"})


@dataclass(frozen=True, slots=True)
class Look:
    """What the terminal can show: characters beyond ASCII, and colour."""

    unicode: bool = True
    colour: bool = False


def render(report: Report, look: Look = Look(), traces: Sequence[str] = ()) -> str:
    """The report as text. `traces` are the paths that waves were written to, told along with the findings."""
    style = UNICODE if look.unicode else ASCII
    lines: list[str] = []
    for section in (
        _header(report),
        _claim(report),
        _verdicts(report),
        _measured(report, style),
        _loops(report),
        _facts(report),
        _counterexamples(report, style),
        _small_print(report, traces),
        _last(report),
    ):
        body = list(section)
        if body:
            lines += [*body, ""]
    text = harmless("\n".join(lines[:-1]))
    if not look.unicode:
        text = text.translate(ASCII_TEXT)
    return _coloured(text) if look.colour else text


def _coloured(text: str) -> str:
    words = "|".join(COLOURS)
    return re.sub(
        rf"(?m)^(verdict  )?({words})\b", lambda m: f"{m[1] or ''}\x1b[1;{COLOURS[m[2]]}m{m[2]}\x1b[0m", text
    )


# -- what was read and claimed -----------------------------------------------------------------------------


def _header(report: Report) -> Iterator[str]:
    ports, design = report.ports, report.ports.design
    yield f"{design.top}  {', '.join(design.files)}"
    parts = [f"clock {ports.clock}"]
    if ports.reset:
        parts.append(f"reset {ports.reset.port} (active {ports.reset.active}, {ports.reset.kind})")
    else:
        parts.append("no reset")
    parts.append(f"output {ports.output}")
    bits = design.state_bits
    parts.append(f"{bits} state bit{'s' * (bits != 1)}")
    yield "  " + ", ".join(parts)
    if design.parameters:
        yield "  parameters " + ", ".join(f"{name}={value}" for name, value in design.parameters.items())
    if ports.holds:
        yield "  held " + ", ".join(f"{name}={value}" for name, value in ports.holds.items())


def _claim(report: Report) -> Iterator[str]:
    spec = report.spec
    if spec.ratio is None:
        return
    within = f", recovery within {spec.within} half-cycles" if spec.within is not None else ""
    period, high = spec.period, spec.high_half_cycles
    text = f"claim  divide by {spec.ratio_text}: period {period} half-cycles, high {high}, "
    yield from _wrapped(f"{text}{_from(report.rhythm)}{within}", "")


def _from(rhythm: Rhythm) -> str:
    if rhythm.scope == "any":
        return "from every power-up state"
    if rhythm.scope == "initial":
        return "from the declared initial values"
    held = rhythm.reset_half_cycles
    return "from reset" + (f" held for {held} half-cycle{'s' * (held != 1)} or longer" if held else "")


# -- what was found ----------------------------------------------------------------------------------------


def _verdicts(report: Report) -> Iterator[str]:
    widest = max((len(finding.name) for finding in report.findings), default=0)
    for finding in report.findings:
        yield from _verdict(finding, widest)


def _verdict(finding: Finding, widest: int) -> Iterator[str]:
    indent = " " * (10 + widest + 2)
    head = f"{finding.verdict.upper():8}  {finding.name:{widest}}  "
    for line in _wrapped(finding.says, indent):
        yield head + line.lstrip() if head else line
        head = ""
    if finding.waived is not None:
        yield f"{indent}WAIVED: {finding.waived}"
    if finding.verdict != "proved":
        yield from _wrapped(f"claimed: {finding.claim}", indent)
    if finding.bound and finding.verdict == "open":
        yield f"{indent}{finding.bound}"
    if finding.method:
        yield f"{indent}method: {finding.method}"
    for obligation in finding.obligations:
        yield from _wrapped(f"obligation: {obligation.text}", indent)
        yield f"{indent}  {obligation.where}: {obligation.where.text.strip()}"
    for key, told in (
        ("if_the_edge_won", "if the edge won"),
        ("slowest_state", "slowest"),
        ("state", "state"),
    ):
        fact = finding.facts.get(key)
        if fact:
            yield from _wrapped(f"{told}: {_told(fact)}", indent)
    illegal = finding.facts.get("illegal_states")
    if illegal is not None:
        yield f"{indent}illegal power-up states: {illegal}"


def _told(fact: Fact) -> str:
    if isinstance(fact, dict):
        return "  ".join(f"{name}={value}" for name, value in fact.items())
    if isinstance(fact, list):
        return ", ".join(str(item) for item in fact)
    return str(fact)


def _wrapped(text: str, indent: str) -> Iterator[str]:
    """The text in lines of the report's width, later lines two further in."""
    line = indent
    for word in text.split(" "):
        if len(line) + len(word) > WIDTH and line.strip():
            yield line.rstrip()
            line = indent + "  "
        line += word + " "
    yield line.rstrip()


def _measured(report: Report, style: Style) -> Iterator[str]:
    rhythm = report.rhythm
    told: dict[str, list[str]] = {}
    drawn: dict[str, Orbit] = {}
    for start, orbit in zip(rhythm.starts, rhythm.orbits, strict=True):
        text = _wave_text(orbit)
        told.setdefault(text, []).append(start.cause)
        drawn.setdefault(text, orbit)
    if not rhythm.starts:
        for orbit in loop_orbits(rhythm, MOST_WAVES):
            count = sum(loop.wave == orbit.wave() for loop in rhythm.loops)
            text = _wave_text(orbit)
            told[text] = [f"{count} of {len(rhythm.loops)} loop{'s' * (len(rhythm.loops) != 1)}"]
            drawn[text] = orbit
    for count, (text, causes) in enumerate(told.items()):
        if count:
            yield ""
        yield from _wrapped(f"measured  {text}", "")
        yield from _wrapped("from: " + ", ".join(dict.fromkeys(causes)), "          ")
        yield from _steady_wave(report, drawn[text], style)
    unsettled = rhythm.settling.unsettled
    if unsettled is not None:
        yield "measured  nothing: the micro-steps never settle"
        yield from _micro_steps(rhythm, unsettled)
    elif not told and rhythm.open and not rhythm.complete:
        yield f"measured  nothing: {rhythm.open}"


def _wave_text(orbit: Orbit) -> str:
    wave = orbit.wave()
    if wave is None:
        return f"not known: {orbit.why}" if orbit.why else "a round of too many runs to write out"
    if wave.stuck:
        return f"the output stays {wave.runs[0][0]}"
    period, high = wave.period or 0, wave.high or 0
    text = f"divides by {_ratio(wave)}: period {period} half-cycles, high {high}"
    if len(wave.runs) > 2:
        pulses = len(wave.runs) // 2
        return f"period {period} half-cycles with {pulses} pulses, high {high}: {_pattern(wave)}"
    return text


def _ratio(wave: Wave) -> str:
    return number(Fraction(wave.period or 0, 2))


def _pattern(wave: Wave) -> str:
    runs = [f"{'high' if level else 'low'} {length}" for level, length in wave.runs[:MOST_RUNS]]
    return ", ".join(runs) + (", …" if len(wave.runs) > MOST_RUNS else "")


def _steady_wave(report: Report, orbit: Orbit, style: Style) -> Iterator[str]:
    """The wave from a rise on, under the numbers of the source edges that it falls on."""
    wave = orbit.wave()
    if wave is None or wave.period is None:
        return
    timeline = Timeline(orbit)
    rise = next(
        t for t in timeline.edges(max(1, timeline.lead), timeline.once + wave.period + 1) if timeline.level(t)
    )
    rounds = 2 if wave.period <= MOST_COLUMNS // 3 else 1
    ends = rise + rounds * wave.period + 2
    points = points_of_interest(timeline, rise, ends, None)
    pieces = plan(rise, ends, points, MARGIN, MOST_COLUMNS, LEAST_FOLD)
    clock_high = timeline.state(rise)[-1]
    rows = (_clock_row(report, timeline), _output_row(report, timeline))
    drawing = Drawing("edge", (1 if clock_high else 2) - rise, 1, rows, tuple(pieces))
    yield ""
    yield from _indented(draw(drawing, style, WIDTH - 2))


def _indented(lines: Iterable[str]) -> Iterator[str]:
    for line in lines:
        yield "  " + line if line else ""


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


# -- loops -------------------------------------------------------------------------------------------------


def _loops(report: Report) -> Iterator[str]:
    """The loops, for a measurement and wherever one of them is not good."""
    rhythm = report.rhythm
    if not rhythm.loops or (report.findings and all(loop.good for loop in rhythm.loops)):
        return
    count = len(rhythm.loops)
    scope = "all power-up states" if rhythm.complete else "the states that were covered"
    yield f"{count} loop{'s' * (count != 1)} of {scope}"
    table = [("period", "high", "states", "", "example")]
    table += [_loop_row(report, loop) for loop in rhythm.loops[:MOST_LOOPS]]
    widths = [max(len(row[i]) for row in table) for i in range(4)]
    for row in table:
        cells = [row[i].rjust(widths[i]) if i < 3 else row[i].ljust(widths[i]) for i in range(4)]
        yield "  " + "  ".join([*cells, row[4]])
    if count > MOST_LOOPS:
        rest = rhythm.loops[MOST_LOOPS:]
        bad = sum(not loop.good for loop in rest)
        stuck = sum(loop.stuck for loop in rest)
        told = f", {bad} of them not good, {stuck} stuck" if any(loop.good for loop in rhythm.loops) else ""
        yield f"  … and {len(rest)} more{told or f', {stuck} of them stuck'}"


def _loop_row(report: Report, loop: Loop) -> tuple[str, str, str, str, str]:
    wave = loop.wave
    word = "stuck" if loop.stuck else "good" if loop.good else ""
    if not word and _knows_good(report.rhythm):
        word = "not good"
    period = "-" if wave.period is None else str(wave.period)
    high = f"={wave.runs[0][0]}" if wave.high is None else str(wave.high)
    return period, high, str(loop.length), word, _state(report, loop.example)


def _knows_good(rhythm: Rhythm) -> bool:
    return any(loop.good for loop in rhythm.loops) or rhythm.recovery is not None


def _state(report: Report, state: State) -> str:
    return _told(dict(report.rhythm.system.describe(state)))


# -- facts -------------------------------------------------------------------------------------------------


def _facts(report: Report) -> Iterator[str]:
    facts = report.facts
    edges = facts.get("source_edges")
    if isinstance(edges, list):
        launched = ", ".join(map(str, edges))
        yield f"rise, fall and next rise on source edges {launched} (edge 1 rises)"
    if "duty" in facts:
        text = f"duty {facts['duty']} of a source of duty d: {facts['duty_at_half']} at d = 0.5"
        if "duty_range" in facts and report.spec.source_duty is not None:
            low, high = (number(end) for end in report.spec.source_duty)
            text += f", {facts['duty_range']} for a source of {low} to {high} %"
        yield from _wrapped(text, "")
    worst = facts.get("worst_recovery_half_cycles")
    if worst is not None:
        cycles = facts["worst_recovery_input_cycles"]
        text = f"worst recovery {worst} half-cycles, {cycles} input cycle{'s' * (cycles != '1')}"
        if "worst_recovery_seconds" in facts:
            text += f", {facts['worst_recovery_seconds']}"
        yield text


# -- counterexamples ---------------------------------------------------------------------------------------


def _counterexamples(report: Report, style: Style) -> Iterator[str]:
    shown: dict[object, str] = {}
    for finding in report.findings:
        broken = finding.trace or finding.counterexample
        if broken is None:
            continue
        if shown:
            yield ""
        yield from _wrapped(f"counterexample to {finding.name}: {broken.text}", "")
        start = broken.orbit.start if isinstance(broken, Counterexample) else id(broken.rests)
        key = (start, broken.begins, broken.ends)
        if key in shown:
            yield f"  the trace drawn for {shown[key]}"
            continue
        shown[key] = finding.name
        if isinstance(broken, Trace):
            yield from _trace(report, broken, style)
        else:
            yield from _counterexample(report, broken, style)


def _trace(report: Report, trace: Trace, style: Style) -> Iterator[str]:
    """A run whose inputs move: its start, and the wave with those inputs."""
    ports = report.ports
    yield from _wrapped(f"start: {trace.cause}", "  ")
    yield from _wrapped(_told({**trace.rests[0].inputs, **trace.rests[0].registers}), "    ")
    made, left = drawing(ports.design, ports.clock, trace, MOST_COLUMNS, MARGIN, LEAST_FOLD, MOST_REGISTERS)
    yield ""
    yield from _indented(draw(made, style, WIDTH - 2))
    yield from _not_drawn(left)


def _counterexample(report: Report, broken: Counterexample, style: Style) -> Iterator[str]:
    orbit = broken.orbit
    timeline = Timeline(orbit)
    yield f"  start: {broken.cause}"
    yield from _wrapped(_state(report, orbit.start), "    ")
    if timeline.loop is not None:
        yield f"  a loop of {timeline.loop} half-cycles, entered at half-cycle {timeline.lead}"
    ends = timeline.end(max(min(timeline.once, broken.ends + 2 * MOST_COLUMNS), broken.ends, SHORTEST) + 2)
    points = points_of_interest(timeline, 0, ends, (broken.begins, min(broken.ends, ends)))
    pieces = tuple(plan(0, ends, points, MARGIN, MOST_COLUMNS, LEAST_FOLD))
    output = replace(_output_row(report, timeline), marked=(broken.begins, broken.ends))
    rows = [_clock_row(report, timeline), output]
    registers, left = _registers_that_matter(report, timeline, pieces)
    rows += [_register_row(report, timeline, index) for index in registers]
    yield ""
    yield from _indented(draw(Drawing("half-cycle", 0, 0, tuple(rows), pieces), style, WIDTH - 2))
    yield from _not_drawn(left)


def _not_drawn(left: int) -> Iterator[str]:
    if left:
        yield f"  {left} more register{'s' * (left != 1)} not drawn"


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


def _micro_steps(rhythm: Rhythm, unsettled: Unsettled) -> Iterator[str]:
    """The round of micro-steps that never ends, a line each."""
    when = "with no clock edge" if unsettled.power_up else "at the next clock edge"
    yield from _wrapped(f"from {_told(dict(rhythm.system.describe(unsettled.state)))}, {when}", "  ")
    for count, state in enumerate(unsettled.cycle[:MOST_LOOPS]):
        yield from _wrapped(f"micro-step {count}: {_told(dict(rhythm.system.describe(state)))}", "    ")
    left = len(unsettled.cycle) - MOST_LOOPS
    yield f"    … {left} more, and again from micro-step 0" if left > 0 else "    and again from micro-step 0"


# -- small print -------------------------------------------------------------------------------------------


def _small_print(report: Report, traces: Sequence[str]) -> Iterator[str]:
    for note in report.notes:
        yield from _wrapped(f"note: {note}", "")
    for trace in traces:
        yield f"trace written to {trace}"
    yield from _wrapped("assumed: " + "; ".join(report.assumptions), "")
    yield from _wrapped(LIMITS, "")


def _last(report: Report) -> Iterator[str]:
    if report.findings:
        waived = sum(finding.waived is not None for finding in report.findings)
        yield f"verdict  {report.verdict.upper()}" + (f" ({waived} waived)" if waived else "")
    yield f"took {report.seconds:.2f} s"
