"""The parts of a report on one divider, each a section of the page."""

from __future__ import annotations

from collections.abc import Callable, Collection, Iterator, Mapping, Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise

from prover.arrival import Glitch
from prover.domain import values_text
from prover.errors import Where
from prover.facts import LIMITS, number
from prover.findings import Counterexample, Finding, Obligation, Report
from prover.ports import Ports
from prover.report import figures, words
from prover.report.figures import Extent
from prover.report.html import recovery, states, waves
from prover.report.html.markup import Content, Markup, element, joined, prose
from prover.report.html.waves import Dimension, Scene
from prover.report.trace import drawing as of_trace
from prover.report.wave import Drawing, Piece, Row, Timeline
from prover.rhythm import Loop, Orbit, Rhythm
from prover.settling import Unsettled
from prover.system import State
from prover.trace import Trace

STEADY = Extent(most=48, margin=5)
BROKEN = Extent(most=96, margin=6)

MOST_WAVES = 4
MOST_LOOPS = 40
MOST_MICRO_STEPS = 64
MOST_VALUES = 100
MOST_ARRIVALS = 40
MOST_WORDS = 8

MOST_STACKED = 16
"""Rows of a table of texts up to which their cells stand one below the other in a narrow window."""

UNIT = "Period and high time are in half-cycles."

LONG = frozenset({"for example", "reason for waiving it", "what is wrong, or the worst"})
"""Headings of columns that hold texts."""


@dataclass(frozen=True, slots=True)
class Place:
    """Where in a page a report stands: a prefix of its identifiers, and the level of its sections' headings."""

    key: str = ""
    level: int = 2


Part = tuple[str, str, list[Markup]]
"""A section's identifier, its title, and what it holds."""


def parts(report: Report, place: Place, left_out: Collection[str] = ()) -> list[Part]:
    """The sections of a report in order, but for those without content and those to be left out."""
    makers: list[tuple[str, str, Callable[[Report, Place], Iterator[Markup]]]] = [
        ("verdicts", "Verdicts", _verdicts),
        ("values", "Values", _each_value),
        ("wave", "Wave", _waves),
        ("counterexamples", "Counterexamples", _counterexamples),
        ("glitches", "Glitches", _glitches),
        ("micro-steps", "Micro-steps", _micro_steps),
        ("states", "States", _states),
        ("facts", "Facts", _facts),
        ("obligations", "Obligations", _obligations),
        ("waivers", "Waivers", _waivers),
        ("assumptions", "Assumptions", _assumptions),
        ("notes", "Notes", _notes),
        ("limits", "Limits", _limits),
    ]
    made = [
        (place.key + key, title, list(maker(report, place)))
        for key, title, maker in makers
        if key not in left_out
    ]
    return [part for part in made if part[2]]


def section(part: Part, place: Place) -> Markup:
    """A part of a report with its heading in the margin."""
    key, title, content = part
    heading = element(f"h{place.level}", title, id=f"{key}-title", class_="title")
    body = element("div", content, class_="body")
    return element("section", heading, body, id=key, class_="part", aria_labelledby=f"{key}-title")


def heading(place: Place, *content: Content, kind: str | None = None) -> Markup:
    """A heading within a section."""
    return element(f"h{place.level + 1}", *content, class_=kind)


def ring_mark(kind: str) -> Markup:
    """A verdict as a ring: closed if it is proved, broken if it is refuted, in pieces if it is open."""
    shapes = {
        "proved": [element("circle", cx=16, cy=16, r=11), element("path", d="M11 16.5l3.5 3.5 6.5-8")],
        "measured": [element("circle", cx=16, cy=16, r=11), element("path", d="M16 9v7l5 3")],
        "refuted": [element("path", d="M20.5 6A11 11 0 1 0 26 11.5"), element("path", d="M22 12l6-8")],
        "open": [element("circle", cx=16, cy=16, r=11, stroke_dasharray="4.6 4.6")],
        "error": [element("path", d="M16 5L28 27H4z"), element("path", d="M16 13v6M16 22v2")],
    }
    name = kind if kind in shapes else "error"
    return element("svg", shapes[name], class_="ringmark", viewBox="0 0 32 32", aria_hidden="true")


def about(ports: Ports, moving: Collection[str] = ()) -> Markup:
    """What was read: files, ports, parameters, and inputs that are held, but for those that are told of elsewhere."""
    design = ports.design
    reset = ports.reset
    rows: list[tuple[str, Content]] = [
        ("files" if len(design.files) > 1 else "file", _listed(design.files)),
        ("clock", _name(ports.clock)),
        ("reset", [_name(reset.port), f", active {reset.active}, {reset.kind}"] if reset else "none"),
        ("output", _name(ports.output)),
        ("state", words.plural(design.state_bits, "bit")),
    ]
    if design.parameters:
        rows.append(("parameters", _listed(f"{name}={value}" for name, value in design.parameters.items())))
    holds = [f"{name}={value}" for name, value in ports.holds.items() if name not in moving]
    if holds:
        rows.append(("held", _listed(holds)))
    rows.append(("sources", ["SHA-256 ", element("code", design.sha256)]))
    return definitions(rows, "about")


def _listed(names: Sequence[str] | Iterator[str]) -> list[Markup]:
    out: list[Markup] = []
    for name in names:
        out += [Markup(", ")] if out else []
        out.append(_name(name))
    return out


def _name(name: str) -> Markup:
    return element("span", name, class_="name")


def definitions(rows: Sequence[tuple[str, Content]], kind: str | None = None) -> Markup:
    """Terms and what they are, in pairs."""
    told = ((term, prose(content) if isinstance(content, str) else content) for term, content in rows)
    pairs = (joined([element("dt", term), element("dd", content)]) for term, content in told)
    return element("dl", pairs, class_=kind)


def _table(head: Sequence[str], rows: Sequence[Sequence[Content]], kind: str | None = None) -> Markup:
    """A table in a box of its own, which scrolls if it is too wide. The first cell of a row is its heading;
    those under a heading of `LONG` may be broken. Where the window is narrow the cells of a row stand one below the
    other, each beside its heading, but for tables of a kind and for long ones."""
    titles = (element("th", name, scope="col") for name in head)
    kinds = ["long" if name in LONG else "short" for name in head]
    body = (
        element(
            "tr",
            element("th", row[0], scope="row", data_head=head[0]),
            (
                element("td", cell, class_=kind, data_head=name)
                for cell, kind, name in zip(row[1:], kinds[1:], head[1:], strict=True)
            ),
        )
        for row in rows
    )
    kind = kind or ("told" if len(rows) <= MOST_STACKED else None)
    made = element("table", element("thead", element("tr", titles)), element("tbody", body), class_=kind)
    return element("div", made, class_="scroll")


# -- verdicts ----------------------------------------------------------------------------------------------


def _verdicts(report: Report, place: Place) -> Iterator[Markup]:
    if report.findings:
        yield element("ol", (_verdict(finding, place) for finding in report.findings), class_="verdicts")


def _verdict(finding: Finding, place: Place) -> Markup:
    waived = [element("span", "waived", class_="word waived")] if finding.waived is not None else []
    head = element(
        "div",
        heading(place, finding.name),
        element("span", finding.verdict, class_=f"word {finding.verdict}"),
        *waived,
        class_="head",
    )
    rows: list[tuple[str, Content]] = [("claimed", finding.claim)]
    if finding.bound:
        rows.append(("bound", finding.bound))
    if finding.method:
        rows.append(("method", finding.method))
    rows += [(name, _lines(parts)) for name, parts in words.facts_of(finding)]
    if finding.obligations:
        link = element(
            "a", words.plural(len(finding.obligations), "obligation"), href=f"#{place.key}obligations"
        )
        rows.append(("rests on", link))
    if finding.waived is not None:
        rows.append(("waived", finding.waived))
    content = element("div", head, element("p", prose(finding.says), class_="says"), definitions(rows))
    return element("li", element("div", ring_mark(finding.verdict), class_=finding.verdict), content)


def _lines(parts: Sequence[str]) -> Content:
    """A text, or several with a line for each."""
    return parts[0] if len(parts) == 1 else [element("div", prose(part)) for part in parts]


def _each_value(report: Report, place: Place) -> Iterator[Markup]:
    """What came of each value of the inputs, and which of them all the rest is about."""
    each = report.each
    if each is None:
        return
    rows = sorted(each.rows, key=lambda row: ("refuted", "open", "proved").index(row.verdict))
    body: list[list[Content]] = []
    for row in rows[:MOST_VALUES]:
        values, ratio, told = words.values(row)
        word = element("span", row.verdict, class_=f"word {row.verdict}")
        body.append([values, word, ratio.removeprefix("ratio "), told])
    yield _table(["values", "verdict", "ratio", "what is wrong, or the worst"], body)
    if len(rows) > MOST_VALUES:
        yield element("p", f"And {words.plural(len(rows) - MOST_VALUES, 'more range')} of values.")
    shown = element("span", values_text(each.shown), class_="name")
    yield element(
        "p", "All that follows is about ", shown, ", but for counterexamples that name another value."
    )


# -- waves -------------------------------------------------------------------------------------------------


def _waves(report: Report, place: Place) -> Iterator[Markup]:
    shown = figures.waves(report.rhythm, MOST_WAVES)
    for count, wave in enumerate(shown):
        yield heading(place, prose(wave.text[:1].upper() + wave.text[1:]), kind="sub")
        yield element("p", f"From: {', '.join(wave.causes)}.", class_="quiet")
        drawing = figures.steady(report, wave.orbit, STEADY)
        if drawing is not None:
            scene = _steady_scene(report, wave.orbit, drawing, f"{place.key}wave-{count + 1}")
            note = (
                f"Numbers count the edges of {report.ports.clock}; odd ones rise. An arrowhead marks an edge that "
                f"launches one of {report.ports.output}."
            )
            yield element("figure", waves.figure(scene), element("figcaption", note))
    if not shown and report.rhythm.settling.unsettled is not None:
        yield element("p", "Nothing to measure: the micro-steps never settle.")
    elif not shown:
        yield element("p", _without_wave(report.rhythm))


def _without_wave(rhythm: Rhythm) -> str:
    """Why there is no wave to be drawn."""
    levels = sorted({loop.wave.runs[0][0] for loop in rhythm.loops if loop.stuck})
    if rhythm.complete and levels:
        where = "the only loop" if len(rhythm.loops) == 1 else f"each of {len(rhythm.loops)} loops"
        return f"There is none: on {where} the output stays {' or '.join(map(str, levels))}."
    return f"Not known: {rhythm.open or 'no start state'}."


def _steady_scene(report: Report, orbit: Orbit, drawing: Drawing, key: str) -> Scene:
    """The wave with its high time and its period measured from the first rise on."""
    wave = orbit.wave()
    begins = drawing.pieces[0].begins
    dimensions: list[Dimension] = []
    if wave is not None and wave.period is not None:
        if len(wave.runs) == 2:
            high = wave.runs[0][1]
            dimensions.append(Dimension(1, begins, begins + high, f"high {words.digits(high)}"))
        dimensions.append(Dimension(1, begins, begins + wave.period, f"period {words.digits(wave.period)}"))
    return Scene(drawing, 1, tuple(dimensions), f"{report.ports.output} against {report.ports.clock}", key)


# -- counterexamples ---------------------------------------------------------------------------------------


def _counterexamples(report: Report, place: Place) -> Iterator[Markup]:
    shown: dict[object, str] = {}
    for finding in report.findings:
        broken = finding.trace or finding.counterexample
        if broken is None:
            continue
        at = finding.facts.get("at") if finding.witness else None
        where = f", at {values_text(at)}" if isinstance(at, dict) else ""
        yield heading(place, finding.name, where, kind="sub")
        yield element("p", element("strong", prose(broken.text)))
        start = broken.orbit.start if isinstance(broken, Counterexample) else id(broken.rests)
        key = (id(finding.witness), start, broken.begins, broken.ends)
        if key in shown:
            yield element("p", f"The run drawn for {shown[key]} shows it.")
            continue
        shown[key] = finding.name
        yield from _run(finding.witness or report, broken, finding, f"{place.key}run-{len(shown)}")


def _run(report: Report, broken: Counterexample | Trace, finding: Finding, key: str) -> Iterator[Markup]:
    """A run that breaks a claim: its start, its loop, and the wave with what is broken measured."""
    if isinstance(broken, Trace):
        first = broken.rests[0]
        start, loop = {**first.inputs, **first.registers}, None
        drawing, left = of_trace(report.ports.design, report.ports.clock, broken, BROKEN)
    else:
        timeline = Timeline(broken.orbit)
        start, loop = report.rhythm.system.describe(broken.orbit.start), timeline
        drawing, left = figures.broken(report, broken, BROKEN)
    rows: list[tuple[str, Content]] = [
        ("claimed", finding.claim),
        ("start", broken.cause),
        ("state", values(start)),
    ]
    if loop is not None and loop.loop:
        told = f"{words.digits(loop.loop)} half-cycles, entered at half-cycle {words.digits(loop.lead)}"
        rows.append(("loop", told))
    yield definitions(rows)
    title = f"Counterexample to {finding.name}"
    caption = "Numbers count half-cycles from the start; what stands between the ticks breaks the claim."
    if left:
        caption += f" {words.plural(left, 'more register')} not drawn."
    yield element("figure", waves.figure(broken_scene(drawing, title, key)), element("figcaption", caption))


def broken_scene(drawing: Drawing, title: str, key: str) -> Scene:
    """What is marked, measured. Of several outputs the first that is marked tells what launches its edges."""
    marked = [(index, row.marked) for index, row in enumerate(drawing.rows) if row.marked is not None]
    dimensions = tuple(_stretch(drawing, index, *stretch) for index, stretch in marked)
    return Scene(drawing, marked[0][0] if marked else 1, dimensions, title, key)


def _stretch(drawing: Drawing, index: int, begins: int, ends: int) -> Dimension:
    """The stretch that is broken, with its length where it reaches from edge to edge. Inputs may move in the middle
    of its first and of its last half-cycle; then an edge that is there bounds it."""
    row = drawing.rows[index]
    per = drawing.per
    last = max(piece.ends for piece in drawing.pieces)

    def edge(at: int) -> bool:
        return 0 < at < last and row.value(at - 1) != row.value(at)

    first = next((at for at in range(begins, begins + per) if edge(at)), begins)
    then = next((at for at in range(ends, ends - per, -1) if edge(at)), max(ends, begins + 1))
    if not (edge(first) and edge(then) and first < then):
        return Dimension(index, begins, max(ends, begins + 1), "here", fault=True)
    length = Fraction(then - first, per)
    told = words.digits(int(length)) if length.denominator == 1 else number(length)
    return Dimension(index, first, then, f"{told} half-cycle{'s' * (length != 1)}", fault=True)


def values(named: Mapping[str, int]) -> Markup:
    """Values by name, each in one piece."""
    pairs = [element("code", f"{name}={value}") for name, value in named.items()]
    return joined(part for pair in pairs for part in (pair, Markup(" ")))


def _glitches(report: Report, place: Place) -> Iterator[Markup]:
    """Half-cycles in which the output pulses: what arrives at it in which order, and what it is after each."""
    for finding in report.findings:
        if finding.glitch is not None:
            yield from _glitch(finding.witness or report, finding.glitch, f"{place.key}glitch-{finding.name}")


def _glitch(report: Report, shown: Glitch, key: str) -> Iterator[Markup]:
    why = (
        "whatever gates it is made of"
        if shown.kind == "function"
        else "through the gates as they are written"
    )
    output, clock = report.ports.output, report.ports.clock
    told = (
        f"{output} changes {words.plural(shown.changes, 'time')} at the {shown.edge} edge of {clock}, {why}"
    )
    yield element("p", element("strong", told))
    yield definitions([("from", values(shown.state)), ("driven at", _source(shown.where))])
    if len(shown.arrivals) <= MOST_ARRIVALS:
        scene = _arrivals_scene(report, shown, key)
        note = (
            "From left to right the order of arrival within one half-cycle; how long each takes is not drawn."
        )
        yield element("figure", waves.figure(scene), element("figcaption", note))
    head, *rows = words.glitch_table(report, shown, MOST_WORDS)
    numbered = [[str(place), *row] for place, row in enumerate(rows[: MOST_MICRO_STEPS + 1])]
    yield _table(["arrival", *head], numbered, "machine")
    left = len(shown.arrivals) - MOST_MICRO_STEPS
    if left > 0:
        yield element("p", f"{left} more.")


def _arrivals_scene(report: Report, shown: Glitch, key: str) -> Scene:
    """The arrivals as columns: before any of them, then after each."""
    levels = [shown.level, *(arrival.level for arrival in shown.arrivals)]
    names = list(dict.fromkeys(arrival.name for arrival in shown.arrivals))
    rows = [_arrivals_row(report.ports.output, levels)]
    for name in names:
        moves = [(i + 1, a) for i, a in enumerate(shown.arrivals) if a.name == name]
        values = [moves[0][1].old] * len(levels)
        for at, arrival in moves:
            values[at:] = [arrival.new] * (len(levels) - at)
        rows.append(_arrivals_row(name, values))
    changes = [i for i in range(1, len(levels)) if levels[i] != levels[i - 1]]
    pulse = tuple(Dimension(0, a, b, "pulse", fault=True) for a, b in pairwise(changes[:2]))
    # One column more, so that the last level is seen as well as the others.
    drawing = Drawing("arrival", 0, 0, tuple(rows), (Piece(0, len(levels)),))
    return Scene(drawing, 0, pulse, f"A pulse of {report.ports.output}", key, clocked=False)


def _arrivals_row(name: str, values: Sequence[int]) -> Row:
    def steady(begins: int, ends: int) -> int | None:
        return values[begins] if len(set(values[begins:ends])) == 1 else None

    return Row(name, max(value.bit_length() for value in (*values, 1)), values.__getitem__, steady)


def _micro_steps(report: Report, place: Place) -> Iterator[Markup]:
    """The round of micro-steps that never ends, a row each."""
    unsettled = next((f.unsettled for f in report.findings if f.unsettled is not None), None)
    unsettled = unsettled or report.rhythm.settling.unsettled
    if unsettled is not None:
        yield from _round(report, unsettled)


def _round(report: Report, unsettled: Unsettled) -> Iterator[Markup]:
    when = "with no clock edge" if unsettled.power_up else "at the next clock edge"
    count = len(unsettled.cycle)
    yield element(
        "p", f"A round of {words.plural(count, 'micro-step')} goes on for ever, {when}. No time passes in it."
    )
    system = report.rhythm.system

    def told(state: State) -> dict[str, int]:
        return system.describe(state)

    yield element("p", "From: ", values(told(unsettled.state)))
    names = list(told(unsettled.state))
    cycle = unsettled.cycle[:MOST_MICRO_STEPS]
    rows = [[str(step), *(str(told(state)[name]) for name in names)] for step, state in enumerate(cycle)]
    yield _table(["micro-step", *names], rows, "machine")
    left = count - len(cycle)
    yield element(
        "p", f"{left} more, and again from micro-step 0." if left > 0 else "And again from micro-step 0."
    )


# -- states ------------------------------------------------------------------------------------------------


def _states(report: Report, place: Place) -> Iterator[Markup]:
    rhythm, census = report.rhythm, report.rhythm.census
    if rhythm.loops:
        yield from _loops(report)
    small = states.machine(report)
    if small is not None:
        yield from _graph(report, small, place)
    if census is not None and census.recovery:
        total = sum(census.leading)
        yield heading(place, "Recovery", kind="sub")
        yield element("p", prose(recovery.summary(census.recovery, total)))
        if census.recovery[-1][0] > 0:
            yield element(
                "figure", recovery.plot(census.recovery, total, report.spec.within, f"{place.key}recovery")
            )
    elif rhythm.recovery is not None:
        yield heading(place, "Recovery", kind="sub")
        yield element("p", prose(_bound(report)))


def _bound(report: Report) -> str:
    found = report.rhythm.recovery
    if found is None or (found.worst is None and found.lost is None):
        return f"Not known: {found.open if found else report.rhythm.open}."
    if found.worst is None:
        return "Some power-up state never becomes good."
    told = "exactly" if found.exact else "at most"
    text = f"Every power-up state is good after {told} {words.plural(found.worst, 'half-cycle')}"
    if found.slowest is not None:
        text += f"; the slowest is {words.state(report, found.slowest)}"
    return text + ". The machine is too wide to count its states one by one."


def _loops(report: Report) -> Iterator[Markup]:
    rhythm, census = report.rhythm, report.rhythm.census
    count = len(rhythm.loops)
    if rhythm.complete:
        where = "the one loop that there is" if count == 1 else f"one of {count} loops"
        yield element("p", f"From every power-up state the machine runs into {where}. {UNIT}")
    else:
        yield element(
            "p", f"{words.plural(count, 'loop')} of the states that were covered; there may be more. {UNIT}"
        )
    head = ["loop", "kind", "period", "high", "states"]
    head += ["power-up states that run into it"] if census else []
    rows: list[list[Content]] = []
    for index, loop in enumerate(rhythm.loops[:MOST_LOOPS]):
        row: list[Content] = [str(index + 1), _kind(report, loop), *_figures(loop), words.digits(loop.length)]
        row += [words.digits(census.leading[index])] if census else []
        rows.append([*row, element("code", words.state(report, loop.example))])
    yield _table([*head, "for example"], rows)
    if count > MOST_LOOPS:
        rest = rhythm.loops[MOST_LOOPS:]
        bad, stuck = sum(not loop.good for loop in rest), sum(loop.stuck for loop in rest)
        yield element("p", f"And {len(rest)} more: {bad} of them not good, {stuck} stuck.")


def _kind(report: Report, loop: Loop) -> str:
    return {"not good": "false"}.get(kind := words.loop_kind(loop, report.rhythm), kind) or "—"


def _figures(loop: Loop) -> tuple[str, str]:
    wave = loop.wave
    if wave.period is None or wave.high is None:
        return "none", f"stays {wave.runs[0][0]}"
    return words.digits(wave.period), words.digits(wave.high)


def _graph(report: Report, small: states.Machine, place: Place) -> Iterator[Markup]:
    yield heading(place, "Where each state leads", kind="sub")
    told = ["A box is a state, filled where the output is 1"]
    if small.key:
        told.append(f"written {small.key}")
    if small.rank:
        told.append("with a dashed frame where it is not good")
    if small.slowest is not None:
        told.append("marked * where it is the slowest to become good")
    if small.starts:
        told.append("marked ▸ where the ratio is claimed from")
    yield element("p", ", ".join(told) + ". Arrows are edges of the clock.", class_="quiet")
    yield element("div", states.figures(report, small, f"{place.key}loop"), class_="rings")
    left = len(report.rhythm.loops) - states.MOST_DRAWN
    if left > 0:
        yield element("p", f"{words.plural(left, 'more loop')} not drawn; the table has all states.")
    listed = element("div", states.table(small), class_="scroll machine")
    yield element("details", element("summary", f"All {len(small.after)} states in a table"), listed)


# -- facts and small print ---------------------------------------------------------------------------------


def _facts(report: Report, place: Place) -> Iterator[Markup]:
    rows = [(name.removesuffix(":"), told) for name, told in words.facts(report)]
    if rows:
        yield definitions(rows)


def _obligations(report: Report, place: Place) -> Iterator[Markup]:
    yield from obligations([(f.name, each) for f in report.findings for each in f.obligations])


def obligations(due: Sequence[tuple[str, Obligation]]) -> Iterator[Markup]:
    """Timing obligations, each with what it is due to."""
    if due:
        yield element(
            "p", "The proofs rest on these timing inequalities, which timing analysis has to discharge."
        )
        yield element("ol", (element("li", _obligation(name, each)) for name, each in due))


def _obligation(name: str, due: Obligation) -> list[Markup]:
    return [element("span", prose(f"{due.text} ({name})")), *_source(due.where)]


def _source(where: Where) -> list[Markup]:
    line = element("code", where.text.strip(), class_="source", tabindex=0)
    return [element("div", element("code", str(where)), class_="quiet"), line]


def _waivers(report: Report, place: Place) -> Iterator[Markup]:
    waived = [finding for finding in report.findings if finding.waived is not None]
    if waived:
        rows: list[list[Content]] = [[f.name, f.verdict, f.waived] for f in waived]
        yield _table(["property", "verdict", "reason for waiving it"], rows)


def _assumptions(report: Report, place: Place) -> Iterator[Markup]:
    yield from texts(report.assumptions)


def _notes(report: Report, place: Place) -> Iterator[Markup]:
    yield from texts(report.notes)


def texts(told: Sequence[str]) -> Iterator[Markup]:
    """A list of texts, if there are any."""
    if told:
        yield element("ul", (element("li", each) for each in told))


def _limits(report: Report, place: Place) -> Iterator[Markup]:
    yield element("p", LIMITS)
