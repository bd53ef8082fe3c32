"""The report that people read: what was read, claimed and found, with waves drawn against the clock.

Plain text first, so that it reads the same in a pipe; colour only underlines the verdict words. The same
input gives the same text, but for the last line, which says how long it took.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence

from prover.arrival import Glitch
from prover.domain import values_text
from prover.facts import LIMITS
from prover.findings import Counterexample, Finding, Report
from prover.report import figures, words
from prover.report.look import PLAIN, Look, finished
from prover.report.trace import drawing
from prover.report.wave import ASCII, UNICODE, Style, Timeline, draw
from prover.rhythm import Loop, Orbit, Rhythm
from prover.settling import Unsettled
from prover.trace import Trace

WIDTH = 100
"""Characters a line: fixed, so that the report does not hang on the window it is shown in."""

EXTENT = figures.Extent()

MOST_WAVES = 3
MOST_ROWS = 20
MOST_LOOPS = 20
MOST_WORDS = 5
MOST_ARRIVALS = 24
"""What is told of a glitch: values of words beside the output, and arrivals."""


def render(report: Report, look: Look = PLAIN, traces: Sequence[str] = ()) -> str:
    """The report as text. `traces` are the paths that waves were written to, told along with the findings."""
    style = UNICODE if look.unicode else ASCII
    lines: list[str] = []
    for section in (
        _header(report),
        _claim(report),
        _verdicts(report),
        _values(report),
        _measured(report, style),
        _loops(report),
        _facts(report),
        _counterexamples(report, style),
        small_print(report.notes, report.assumptions, traces),
        _last(report),
    ):
        body = list(section)
        if body:
            lines += [*body, ""]
    return finished(lines[:-1], look)


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
    each = report.each.shown if report.each else {}
    holds = {name: value for name, value in ports.holds.items() if name not in each}
    if holds:
        yield "  held " + ", ".join(f"{name}={value}" for name, value in holds.items())


def _claim(report: Report) -> Iterator[str]:
    if report.spec.ratio is not None:
        yield from wrapped(f"claim  {words.claim(report)}", "")


# -- what was found ----------------------------------------------------------------------------------------


def _verdicts(report: Report) -> Iterator[str]:
    widest = max((len(finding.name) for finding in report.findings), default=0)
    for finding in report.findings:
        yield from _verdict(finding, widest)


def _verdict(finding: Finding, widest: int) -> Iterator[str]:
    indent = " " * (10 + widest + 2)
    head = f"{finding.verdict.upper():8}  {finding.name:{widest}}  "
    for line in wrapped(finding.says, indent):
        yield head + line.lstrip() if head else line
        head = ""
    if finding.waived is not None:
        yield f"{indent}WAIVED: {finding.waived}"
    if finding.verdict != "proved":
        yield from wrapped(f"claimed: {finding.claim}", indent)
    if finding.bound and finding.verdict == "open":
        yield f"{indent}{finding.bound}"
    if finding.method:
        yield f"{indent}method: {finding.method}"
    for obligation in finding.obligations:
        yield from wrapped(f"obligation: {obligation.text}", indent)
        for where in dict.fromkeys([obligation.where, *(place for _, place in obligation.via)]):
            yield f"{indent}  {where}: {where.text.strip()}"
    for name, parts in words.facts_of(finding):
        told = ", ".join(parts)
        yield from wrapped(f"{name}: {told}", indent)


def _values(report: Report) -> Iterator[str]:
    """What came of each value of the inputs, and which of them all that follows is about."""
    each = report.each
    if each is None:
        return
    rows = sorted(each.rows, key=lambda row: ("refuted", "open", "proved").index(row.verdict))
    told = [(row.verdict.upper(), *words.values(row)) for row in rows[:MOST_ROWS]]
    widths = [max(len(line[i]) for line in told) for i in range(3)]
    for verdict, values, periods, rest in told:
        text = f"{verdict:{widths[0]}}  {values:{widths[1]}}  {periods:{widths[2]}}  {rest}"
        yield from wrapped(text.rstrip(), "")
    if len(rows) > MOST_ROWS:
        yield f"… and {len(rows) - MOST_ROWS} more ranges of values"
    yield ""
    yield f"at {values_text(each.shown)}"


def wrapped(text: str, indent: str) -> Iterator[str]:
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
    waves = figures.waves(rhythm, MOST_WAVES)
    for count, wave in enumerate(waves):
        if count:
            yield ""
        yield from wrapped(f"measured  {wave.text}", "")
        yield from wrapped("from: " + ", ".join(wave.causes), "          ")
        yield from _steady_wave(report, wave.orbit, style)
    unsettled = rhythm.settling.unsettled
    if unsettled is not None:
        yield "measured  nothing: the micro-steps never settle"
        yield from _micro_steps(rhythm, unsettled)
    elif not waves and rhythm.open and not rhythm.complete:
        yield f"measured  nothing: {rhythm.open}"


def _steady_wave(report: Report, orbit: Orbit, style: Style) -> Iterator[str]:
    made = figures.steady(report, orbit, EXTENT)
    if made is not None:
        yield ""
        yield from indented(draw(made, style, WIDTH - 2))


def indented(lines: Iterable[str]) -> Iterator[str]:
    """The lines of a drawing as they stand in the report."""
    for line in lines:
        yield "  " + line if line else ""


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
    period = "-" if wave.period is None else str(wave.period)
    high = f"={wave.runs[0][0]}" if wave.high is None else str(wave.high)
    kind = words.loop_kind(loop, report.rhythm)
    return period, high, str(loop.length), kind, words.state(report, loop.example)


# -- facts -------------------------------------------------------------------------------------------------


def _facts(report: Report) -> Iterator[str]:
    for name, told in words.facts(report):
        yield from wrapped(f"{name} {told}", "")


# -- counterexamples ---------------------------------------------------------------------------------------


def _counterexamples(report: Report, style: Style) -> Iterator[str]:
    shown: dict[object, str] = {}
    for finding in report.findings:
        broken = finding.trace or finding.counterexample
        if broken is None:
            if finding.glitch is not None:
                if shown:
                    yield ""
                yield from _glitch(finding.witness or report, finding.glitch)
                shown[id(finding)] = finding.name
            continue
        if shown:
            yield ""
        at = finding.facts.get("at") if finding.witness else None
        where = f", at {values_text(at)}" if isinstance(at, dict) else ""
        yield from wrapped(f"counterexample to {finding.name}{where}: {broken.text}", "")
        start = broken.orbit.start if isinstance(broken, Counterexample) else id(broken.rests)
        key = (id(finding.witness), start, broken.begins, broken.ends)
        if key in shown:
            yield f"  the trace drawn for {shown[key]}"
            continue
        shown[key] = finding.name
        if isinstance(broken, Trace):
            yield from _trace(finding.witness or report, broken, style)
        else:
            yield from _counterexample(finding.witness or report, broken, style)


def _glitch(report: Report, glitch: Glitch) -> Iterator[str]:
    """What arrives at the output within one half-cycle, a line each, in an order that makes it pulse."""
    edge = f"the {glitch.edge} edge of {report.ports.clock}"
    yield from wrapped(f"glitch of {report.ports.output} at {edge}, driven at {glitch.where}", "")
    yield f"  {glitch.where.text.strip()}"
    yield from wrapped(f"from {words.fact(dict(glitch.state))}", "  ")
    yield ""
    table = words.glitch_table(report, glitch, MOST_WORDS)
    widths = [max(len(row[i]) for row in table) for i in range(len(table[0]))]
    for row in table[: MOST_ARRIVALS + 2]:
        cells = [cell.ljust(width) for cell, width in zip(row, widths, strict=True)]
        yield ("  " + "  ".join(cells)).rstrip()
    left = len(table) - MOST_ARRIVALS - 2
    if left > 0:
        yield f"  … {left} more"


def _trace(report: Report, trace: Trace, style: Style) -> Iterator[str]:
    """A run whose inputs move: its start, and the wave with those inputs."""
    yield from wrapped(f"start: {trace.cause}", "  ")
    yield from wrapped(words.fact({**trace.rests[0].inputs, **trace.rests[0].registers}), "    ")
    made, left = drawing(report.ports.design, report.ports.clock, trace, EXTENT)
    yield ""
    yield from indented(draw(made, style, WIDTH - 2))
    yield from not_drawn(left)


def _counterexample(report: Report, broken: Counterexample, style: Style) -> Iterator[str]:
    orbit = broken.orbit
    timeline = Timeline(orbit)
    yield f"  start: {broken.cause}"
    yield from wrapped(words.state(report, orbit.start), "    ")
    if timeline.loop is not None:
        yield f"  a loop of {timeline.loop} half-cycles, entered at half-cycle {timeline.lead}"
    made, left = figures.broken(report, broken, EXTENT)
    yield ""
    yield from indented(draw(made, style, WIDTH - 2))
    yield from not_drawn(left)


def not_drawn(left: int) -> Iterator[str]:
    """How many registers a drawing leaves out."""
    if left:
        yield f"  {left} more register{'s' * (left != 1)} not drawn"


def _micro_steps(rhythm: Rhythm, unsettled: Unsettled) -> Iterator[str]:
    """The round of micro-steps that never ends, a line each."""
    when = "with no clock edge" if unsettled.power_up else "at the next clock edge"
    yield from wrapped(f"from {words.fact(dict(rhythm.system.describe(unsettled.state)))}, {when}", "  ")
    for count, state in enumerate(unsettled.cycle[:MOST_LOOPS]):
        yield from wrapped(f"micro-step {count}: {words.fact(dict(rhythm.system.describe(state)))}", "    ")
    left = len(unsettled.cycle) - MOST_LOOPS
    yield f"    … {left} more, and again from micro-step 0" if left > 0 else "    and again from micro-step 0"


# -- small print -------------------------------------------------------------------------------------------


def small_print(notes: Sequence[str], assumptions: Sequence[str], traces: Sequence[str]) -> Iterator[str]:
    """What closes a report: remarks, the waves that were written, what is assumed, and the limits of a proof."""
    for note in notes:
        yield from wrapped(f"note: {note}", "")
    for trace in traces:
        yield f"trace written to {trace}"
    yield from wrapped("assumed: " + "; ".join(assumptions), "")
    yield from wrapped(LIMITS, "")


def _last(report: Report) -> Iterator[str]:
    if report.findings:
        waived = sum(finding.waived is not None for finding in report.findings)
        yield f"verdict  {report.verdict.upper()}" + (f" ({waived} waived)" if waived else "")
    yield f"took {report.seconds:.2f} s"
