"""Verdicts as JUnit XML, for what collects test results: a suite for each divider, a case for each property.

Refuted is a failure. Open is an error, and so is a divider that could not be read or judged: neither may pass for a
success. What is waived is skipped, with the reason. The form is that of the strict schema in use for these files,
which wants every attribute and both outputs. Times are seconds of the whole divider, because its properties share one
analysis. The host is always `localhost`: which machine it was says nothing about a divider.
"""

from __future__ import annotations

from collections.abc import Iterable, Iterator, Sequence
from datetime import datetime
from xml.etree.ElementTree import Element, SubElement, indent, tostring

from properties import NAMES
from prover.errors import UserError
from prover.facts import LIMITS
from prover.findings import Finding, Report
from prover.output import harmless
from prover.report import figures, words
from prover.several import Lapse, Outcome

MOST_WAVES = 3


def render(found: Sequence[Outcome], when: datetime, lapses: Sequence[Lapse] = ()) -> str:
    """The outcomes as XML text, ended by a newline; `when` is the time of the run, of which no zone is told. Waivers
    that have expired fail in a suite of their own."""
    root = Element("testsuites")
    for number, outcome in enumerate(found):
        _suite(root, number, outcome, when)
    if lapses:
        cases = [(each.name, _said("failure", "expired", each.says)) for each in lapses]
        _made(root, len(found), lapses[0].where.file, "waivers", when, 0.0, cases)
    indent(root)
    return '<?xml version="1.0" encoding="UTF-8"?>\n' + tostring(root, encoding="unicode") + "\n"


def _suite(root: Element, number: int, outcome: Outcome, when: datetime) -> None:
    report = outcome.report
    name = outcome.title or (report.ports.design.top if report else outcome.name)
    seconds = report.seconds if report else 0.0
    told = "\n".join(_told(report)) if report else ""
    _made(root, number, outcome.name, name, when, seconds, list(_cases(outcome)), _properties(outcome), told)


def _made(
    root: Element,
    number: int,
    package: str,
    name: str,
    when: datetime,
    seconds: float,
    cases: Sequence[tuple[str, Element | None]],
    about: Iterable[tuple[str, str]] = (),
    told: str = "",
) -> None:
    """A suite with its cases: the name of each, and the element that says why it did not pass."""
    kinds = [None if said is None else said.tag for _, said in cases]
    suite = _added(
        root,
        "testsuite",
        id=str(number),
        package=package,
        name=name,
        timestamp=when.strftime("%Y-%m-%dT%H:%M:%S"),
        hostname="localhost",
        tests=str(len(cases)),
        failures=str(kinds.count("failure")),
        errors=str(kinds.count("error")),
        skipped=str(kinds.count("skipped")),
        time=f"{seconds:.3f}",
    )
    properties = _added(suite, "properties")
    for key, value in about:
        _added(properties, "property", name=key, value=value)
    for title, said in cases:
        case = _added(suite, "testcase", name=title, classname=name, time="0.000")
        if said is not None:
            case.append(said)
    _added(suite, "system-out").text = harmless(told)
    _added(suite, "system-err").text = ""


def _added(parent: Element, tag: str, **attributes: str) -> Element:
    """A new element inside the parent. What XML 1.0 can't hold stands as an escape, as it does on a terminal."""
    return SubElement(parent, tag, {name: harmless(value) for name, value in attributes.items()})


def _said(tag: str, kind: str | None, message: str, text: str = "") -> Element:
    """What a case that did not pass has inside."""
    made = Element(tag, {"message": harmless(message)} | ({"type": kind} if kind else {}))
    made.text = harmless(text or message)
    return made


def _properties(outcome: Outcome) -> Iterator[tuple[str, str]]:
    yield "files", " ".join(outcome.files)
    report = outcome.report
    if report is None:
        return
    ports, design = report.ports, report.ports.design
    yield "clock", ports.clock
    if ports.reset:
        yield "reset", f"{ports.reset.port}={ports.reset.active}"
    yield "output", ports.output
    for kind, values in (("parameter", design.parameters), ("held", ports.holds)):
        for name, value in values.items():
            yield f"{kind} {name}", str(value)
    yield "claim", words.claim(report)
    yield "sha256", design.sha256
    yield "verdict", report.verdict


def _cases(outcome: Outcome) -> Iterator[tuple[str, Element | None]]:
    """The name of each case, and the element that says why it did not pass."""
    if outcome.report is not None:
        for finding in outcome.report.findings:
            yield finding.name, _of_finding(outcome.report, finding)
    elif outcome.error is not None:
        yield "readable", _said("error", "unusable", _first_line(outcome.error), str(outcome.error))
    elif outcome.fault:
        yield "judged", _said("error", "fault", f"a fault of this program: {outcome.fault}")
    else:
        for name in NAMES:
            yield name, _said("error", "open", outcome.open)


def _first_line(error: UserError) -> str:
    return f"{error.where}: {error.message}" if error.where else error.message


def _of_finding(report: Report, finding: Finding) -> Element | None:
    if finding.verdict == "proved":
        return None
    text = "\n".join(_lines(report, finding))
    if finding.waived is not None:
        return _said("skipped", None, f"waived: {finding.waived}", text)
    if finding.verdict == "refuted":
        return _said("failure", "refuted", finding.says, text)
    return _said("error", "open", finding.says or "open", text)


def _lines(report: Report, finding: Finding) -> Iterator[str]:
    """A finding in words, a line for each thing to be said of it."""
    report = finding.witness or report
    yield f"{finding.verdict}: {finding.says}"
    yield f"claimed: {finding.claim}"
    if finding.bound:
        yield finding.bound
    if finding.method:
        yield f"method: {finding.method}"
    for obligation in finding.obligations:
        yield f"obligation: {obligation.text}, at {obligation.where}"
    broken = finding.counterexample
    if broken is not None:
        yield f"start: {broken.cause}: {words.state(report, broken.orbit.start)}"
        yield f"broken from half-cycle {broken.begins} to {broken.ends}"
    if finding.trace is not None:
        first = finding.trace.rests[0]
        yield f"start: {finding.trace.cause}: {words.fact({**first.inputs, **first.registers})}"
        yield f"broken from half-cycle {finding.trace.begins} to {finding.trace.ends}"
    if finding.unsettled is not None:
        yield f"start: {words.state(report, finding.unsettled.state)}"
    if finding.glitch is not None:
        yield f"from: {words.fact(dict(finding.glitch.state))}, driven at {finding.glitch.where}"
        for arrival in finding.glitch.arrivals:
            moved = f"{arrival.name} {arrival.old}→{arrival.new}"
            yield f"micro-step {arrival.micro_step}: {moved}: {report.ports.output}={arrival.level}"


def _told(report: Report) -> Iterator[str]:
    """What goes with the verdicts: what was measured, proved under which obligations, assumed; remarks; limits."""
    for wave in figures.waves(report.rhythm, MOST_WAVES):
        yield f"measured: {wave.text}, from: {', '.join(wave.causes)}"
    for finding in report.findings:
        if finding.verdict == "proved":
            yield f"{finding.name}: {finding.says}"
            for obligation in finding.obligations:
                yield f"obligation: {obligation.text}, at {obligation.where}"
    yield from (f"note: {note}" for note in report.notes)
    yield f"assumed: {'; '.join(report.assumptions)}"
    yield LIMITS
