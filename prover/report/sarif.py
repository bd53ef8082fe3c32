"""Verdicts in the Static Analysis Results Interchange Format, SARIF 2.1.0: what code review and merge gates read.

A rule is a property, a result its verdict on one divider:

    kind           from                                                      level
    fail           refuted; a waiver is a suppression with its reason        error
    open           open; a divider that took more than the effort: all open  none
    pass           proved                                                    none
    review         an obligation that a proof leaves to timing analysis      none
    notApplicable  a property of which nothing is claimed: no reset, no one  none
                   high time
    informational  the wave that was measured                                none

A result of another kind than `fail` has the level `none`: the standard wants it so, and its schema does not check it.
A counterexample is a code flow: a location a half-cycle, with what changes in it as its message and the values as its
state; long stretches are folded, and no more than MOST_STEPS half-cycles are told. Remarks are notifications, and so
is what could not be read, which makes the run an unsuccessful one. Nothing in the log hangs on when or how fast it
was made: the same input gives the same bytes.
"""

from __future__ import annotations

import hashlib
import os
from collections import Counter
from collections.abc import Iterable, Iterator, Mapping, Sequence
from json import dumps
from pathlib import Path
from typing import Any
from urllib.parse import quote

from properties import EVERY, NAMES
from prover import __version__
from prover import expr as e
from prover.arrival import Glitch
from prover.design import Register
from prover.errors import Where
from prover.facts import LIMITS
from prover.findings import Counterexample, Finding, Report
from prover.output import harmless
from prover.report import figures
from prover.report.certificate import digest
from prover.report.wave import UNICODE, Timeline, fold_text, plan, points_of_interest
from prover.settling import Unsettled
from prover.several import Lapse, Outcome
from prover.trace import Rest, Trace
from prover.verilog.source import MAX_SHOWN, printable

SCHEMA = "https://raw.githubusercontent.com/oasis-tcs/sarif-spec/master/Schemata/sarif-schema-2.1.0.json"
"""The schema's own identifier, by which readers know the version."""

ROOT = "ROOT"
"""Stands for the working folder, below which relative addresses lie."""

MEASURED = "measured"
"""The rule of results that only inform."""

WAIVER = "waiver"
"""The rule of waivers that have expired."""

MOST_STEPS = 96
"""Half-cycles told of one counterexample, folds aside."""

MARGIN = 4
LEAST_FOLD = 8

MOST_VALUES = 32
"""Registers whose values a step holds."""

FINGERPRINT = "claim/v1"
"""The name of the fingerprint that results have (clause 3.27.17), with the version of how it is made."""

MOST_RELATED = 16
MOST_WAVES = 3

Object = dict[str, Any]
Values = Mapping[str, int]


def render(found: Sequence[Outcome], lapses: Sequence[Lapse] = ()) -> str:
    """The outcomes as one log with one run, ended by a newline. A waiver that has expired is a result that fails."""
    return dumps(Log(found, lapses).as_object(), indent=2) + "\n"


class Log:
    """One run of the tool: the files it read are numbered as results come to speak of them."""

    def __init__(self, found: Sequence[Outcome], lapses: Sequence[Lapse] = ()) -> None:
        self.found, self.lapses = found, lapses
        self.rules = [*(module.NAME for module in EVERY), MEASURED, WAIVER]
        self.artifacts: dict[str, Object] = {}
        self.known: Counter[str] = Counter()
        """How many results have had an identity so far."""
        self.named: dict[str, str] = {}
        """The path of each file by the name that places in it bear."""

    def as_object(self) -> Object:
        """The log as plain dictionaries and lists."""
        results: list[Object] = []
        notes: list[Object] = []
        for outcome in self.found:
            report = outcome.report
            for path in report.ports.design.files if report else outcome.files:
                self._artifact(path)
                self.named.setdefault(printable(path, MAX_SHOWN), path)
            if report is not None:
                results += _Results(self, report, outcome.title).all()
                notes += [
                    self._notification("note", note.message, note.where) for note in report.ports.design.notes
                ]
            elif outcome.open:
                results += [self._left_open(name, outcome) for name in NAMES]
            else:
                notes.append(self._failure(outcome))
        for lapse in self.lapses:
            place = self.location(lapse.where)
            results.append(self.result(WAIVER, "fail", f"{lapse.name}: {lapse.says}", place, [lapse.name]))
        readable = all(outcome.error is None and not outcome.fault for outcome in self.found)
        run: Object = {
            "tool": {"driver": self._driver()},
            "invocations": [{"executionSuccessful": readable, "toolExecutionNotifications": notes}],
            "originalUriBaseIds": {ROOT: {"description": message("the folder in which the command was run")}},
            "artifacts": list(self.artifacts.values()),
            "results": results,
            "columnKind": "unicodeCodePoints",
        }
        return {"$schema": SCHEMA, "version": "2.1.0", "runs": [run]}

    def _driver(self) -> Object:
        rules = [_rule(module.NAME, described(module), "error") for module in EVERY]
        rules.append(_rule(MEASURED, "the wave that the divider makes; nothing is claimed of it", "none"))
        rules.append(_rule(WAIVER, "no waiver of a gate stands beyond its last day", "error"))
        return {
            "name": "Subharmonic",
            "version": __version__,
            "fullDescription": {
                "text": text(f"Proves what a clock divider written in Verilog does. {LIMITS}")
            },
            "rules": rules,
        }

    def _left_open(self, name: str, outcome: Outcome) -> Object:
        where = Where(printable(outcome.name, MAX_SHOWN), 1)
        identity = (outcome.title, _portable(outcome.name))
        return self.result(name, "open", f"{name}: {outcome.open}", self.location(where), identity)

    def _failure(self, outcome: Outcome) -> Object:
        """Why a divider has no report."""
        if outcome.error is None:
            where = Where(printable(outcome.name, MAX_SHOWN), 1)
            return self._notification("error", f"a fault of this program: {outcome.fault}", where)
        hint = f"; {outcome.error.hint}" if outcome.error.hint else ""
        place = outcome.error.where or Where(printable(outcome.name, MAX_SHOWN), 1)
        return self._notification("error", outcome.error.message + hint, place)

    def _notification(self, level: str, said: str, where: Where) -> Object:
        return {"level": level, "message": message(said), "locations": [self.location(where)]}

    def result(
        self, name: str, kind: str, said: str, location: Object, identity: Sequence[str], **more: Any
    ) -> Object:
        """A result of a rule. Only what fails has a level. What its `identity` is with that of the rule tells it from
        all other results, and is the same in the next run: it says nothing of lines, verdicts and this machine."""
        named = "\0".join((name, *identity))
        self.known[named] += 1
        print_of = hashlib.sha256(
            f"{named}\0{self.known[named]}".encode(errors="surrogateescape")
        ).hexdigest()
        return {
            "ruleId": name,
            "ruleIndex": self.rules.index(name),
            "kind": kind,
            "level": "error" if kind == "fail" else "none",
            "message": message(said),
            "locations": [location],
            "partialFingerprints": {FINGERPRINT: print_of[:32]},
            **more,
        }

    # -- places --------------------------------------------------------------------------------------------

    def location(self, where: Where, said: str = "", context: bool = True) -> Object:
        """A place in a source, with its line as the context."""
        path = self.named.get(where.file, where.file)
        place: Object = {"artifactLocation": self._artifact(path)["location"]}
        place["region"] = {"startLine": where.line, "startColumn": where.column}
        if context and where.text.strip():
            place["contextRegion"] = {"startLine": where.line, "snippet": {"text": where.text}}
        return {"physicalLocation": place, **({"message": message(said)} if said else {})}

    def _artifact(self, path: str) -> Object:
        """A file's entry, made when first asked for; without a digest where the file can't be read."""
        if path not in self.artifacts:
            made: Object = {
                "location": {**address(path), "index": len(self.artifacts)},
                "sourceLanguage": "toml" if path.endswith(".toml") else "verilog",
            }
            try:
                made["hashes"] = {"sha-256": digest(Path(path))}
            except OSError:
                made["description"] = message("this file could not be read")
            self.artifacts[path] = made
        return self.artifacts[path]


def address(path: str) -> Object:
    """Where a file is: relative to the working folder if it is below it, else from the root of the machine."""
    inner = os.path.relpath(path)
    if inner == os.pardir or inner.startswith(os.pardir + os.sep) or os.path.isabs(inner):
        return {"uri": Path(os.path.abspath(path)).as_uri()}
    return {"uri": quote(os.fsencode(inner.replace(os.sep, "/"))), "uriBaseId": ROOT}


def _portable(path: str) -> str:
    """A file's name that is the same on every machine: from the working folder, or without folders if outside it."""
    inner = address(path)
    return str(inner["uri"]) if "uriBaseId" in inner else os.path.basename(path)


def message(said: str) -> Object:
    """A message object."""
    return {"text": text(said)}


def text(said: str) -> str:
    """Words as a message's plain text: what could act on a terminal as escapes, braces doubled because single ones
    stand for arguments (clause 3.11.5), and no bracket that would begin a link (clause 3.11.6)."""
    return harmless(said).replace("{", "{{").replace("}", "}}").replace("](", "\\](")


def described(module: Any) -> str:
    """What a property claims, from the first line of its module."""
    first = (module.__doc__ or module.NAME).strip().split("\n")[0]
    return str(first.removeprefix(f"{module.NAME}: "))


def _rule(name: str, said: str, level: str) -> Object:
    return {
        "id": name,
        "shortDescription": {"text": text(said)},
        "fullDescription": {"text": text(said)},
        "defaultConfiguration": {"level": level},
    }


# -- the results of one divider ----------------------------------------------------------------------------


class _Results:
    """The results on one divider: what its findings say, and where."""

    def __init__(self, log: Log, report: Report, title: str) -> None:
        self.log, self.report, self.title = log, report, title
        self.design = report.ports.design
        self.registers = {register.name: register for register in self.design.registers}
        names = [v.name for v in e.variables([report.ports.output_value])]
        self.launching = [self.registers[name] for name in names if name in self.registers]
        """The registers that the output is made of."""

    def all(self) -> Iterator[Object]:
        for finding in self.report.findings:
            shown = _Results(self.log, finding.witness, self.title) if finding.witness else self
            yield shown._of_finding(finding, self._identity(finding.claim))
            for obligation in finding.obligations:
                location = self.log.location(obligation.where, obligation.register)
                said, identity = f"obligation: {obligation.text}", self._identity("due", obligation.text)
                yield self.log.result(finding.name, "review", said, location, identity)
        judged = {finding.name for finding in self.report.findings}
        for name in self.log.rules:
            if name not in judged and name not in (MEASURED, WAIVER):
                said = f"{self._who()}: nothing is claimed"
                place = self.log.location(self._output())
                yield self.log.result(name, "notApplicable", said, place, self._identity())
        for wave in figures.waves(self.report.rhythm, MOST_WAVES):
            said = f"{self._who()}: {wave.text}, from: {', '.join(wave.causes)}"
            place = self.log.location(self._output())
            yield self.log.result(MEASURED, "informational", said, place, self._identity())

    def _identity(self, *more: str) -> list[str]:
        """What tells this divider, and more about it, from all others in a run and stays as it is in the next."""
        chosen = {**self.design.parameters, **self.report.ports.holds}
        values = [f"{name}={value}" for name, value in sorted(chosen.items())]
        where = _portable(self.design.files[0])
        return [self.title, where, self.design.top, self.report.ports.output, *values, *more]

    def _who(self) -> str:
        return f"{self.design.top}, output {self.report.ports.output}"

    def _of_finding(self, finding: Finding, identity: Sequence[str]) -> Object:
        kind = {"proved": "pass", "refuted": "fail", "open": "open"}[finding.verdict]
        said = f"{self._who()}: {finding.says}"
        if kind != "pass":
            said += f"; claimed: {finding.claim}"
        more: Object = {}
        related = [self.log.location(r.where, r.name) for r in self.launching[:MOST_RELATED]]
        if related:
            more["relatedLocations"] = related
        flow = self._flow(finding)
        if flow is not None:
            more["codeFlows"] = [flow]
        if finding.waived is not None:
            more["suppressions"] = [{"kind": "external", "justification": harmless(finding.waived)}]
        more["properties"] = {
            "top": self.design.top,
            "claim": finding.claim,
            "method": finding.method,
            "bound": finding.bound,
            "facts": dict(finding.facts),
            "assumptions": list(self.report.assumptions),
        }
        place = self.log.location(self._place(finding))
        return self.log.result(finding.name, kind, said, place, identity, **more)

    # -- where -----------------------------------------------------------------------------------------------

    def _place(self, finding: Finding) -> Where:
        """The line that decides: where a hazard is, what never settles, the register that launches the edge which
        ends what is broken; for a verdict about all runs, the register that drives the output."""
        if finding.unsettled is not None:
            moved = _moving([self.report.rhythm.system.describe(s) for s in finding.unsettled.cycle])
            return self._register(moved) or self._output()
        pulse = next((r for r in self.report.rhythm.settling.races if r.text in finding.says), None)
        if pulse is not None:
            return pulse.where
        if finding.counterexample is not None:
            # Where nothing is launched any more, a register that the output is made of has got stuck.
            launched = self._launched(finding.counterexample) or [r.name for r in self.launching]
            return self._register(launched) or self._output()
        if finding.glitch is not None:
            return finding.glitch.where
        if finding.trace is not None:
            ends = [r.registers for r in finding.trace.rests if abs(r.half_cycle - finding.trace.ends) <= 1]
            return self._register(_moving(ends)) or self._output()
        if finding.obligations:
            return finding.obligations[0].where
        return self._output()

    def _launched(self, broken: Counterexample) -> list[str]:
        """The registers that change where what is broken ends, or else where it begins."""
        timeline, describe = Timeline(broken.orbit), self.report.rhythm.system.describe
        for at in (broken.ends, broken.begins):
            if 0 < at < timeline.end(at + 1):
                moved = _moving([describe(timeline.state(at - 1)), describe(timeline.state(at))])
                if any(register.name in moved for register in self.launching):
                    return moved
        return []

    def _register(self, names: Iterable[str]) -> Where | None:
        """The place of the first of these registers, of those first that the output is made of."""
        among = set(names)
        order: list[Register] = [*self.launching, *self.registers.values()]
        return next((register.where for register in order if register.name in among), None)

    def _output(self) -> Where:
        """The register that is the output; for an output made of several, or of none, where it is driven."""
        if self.report.ports.output_value.op == "var" and self.launching:
            return self.launching[0].where
        name = self.report.ports.output
        signal = self.design.signals.get(name) or self.design.signals.get(name.rpartition("[")[0].rstrip(" "))
        if signal is None:
            return Where(printable(self.design.files[0], MAX_SHOWN), 1)
        return signal.driven or (self.launching[0].where if self.launching else signal.where)

    # -- runs ------------------------------------------------------------------------------------------------

    def _flow(self, finding: Finding) -> Object | None:
        """The run that refutes, if there is one."""
        if finding.counterexample is not None:
            broken = finding.counterexample
            return _code_flow(broken.text, broken.cause, list(self._steps(broken)))
        if finding.trace is not None:
            return _code_flow(finding.trace.text, finding.trace.cause, list(self._rests(finding.trace)))
        if finding.unsettled is not None:
            when = "with no clock edge" if finding.unsettled.power_up else "at the next clock edge"
            return _code_flow("micro-steps without end", when, list(self._micro_steps(finding.unsettled)))
        if finding.glitch is not None:
            edge = f"the {finding.glitch.edge} edge of {self.report.ports.clock}"
            return _code_flow(finding.says, edge, list(self._arrivals(finding.glitch)))
        return None

    def _steps(self, broken: Counterexample) -> Iterator[Object]:
        timeline = Timeline(broken.orbit)
        ends = timeline.end(max(min(timeline.once, broken.ends + MOST_STEPS), broken.ends) + 2)
        points = points_of_interest(timeline, 0, ends, (broken.begins, min(broken.ends, ends)))
        before: Values | None = None
        for piece in plan(0, ends, points, MARGIN, MOST_STEPS, LEAST_FOLD):
            if piece.folded:
                said = f"half-cycles {piece.begins} to {piece.ends - 1}:{fold_text(piece.length, UNICODE)}"
                yield self._step(said.rstrip(), before or {}, [], "unimportant")
                before = self._values(timeline, piece.ends - 1)
                continue
            for at in range(piece.begins, piece.ends):
                values = self._values(timeline, at)
                marked = at in (broken.begins, broken.ends)
                yield self._moved(f"half-cycle {at}", before, values, "essential" if marked else "important")
                before = values

    def _values(self, timeline: Timeline, at: int) -> Values:
        place = timeline.place(at)
        return {**self.report.rhythm.system.describe(place.state), self._out(): place.level}

    def _out(self) -> str:
        """The output's name, told apart from that of a register."""
        name = self.report.ports.output
        return name if name not in self.registers else f"output {name}"

    def _rests(self, trace: Trace) -> Iterator[Object]:
        points = (trace.begins, trace.ends, 0, trace.half_cycles)
        pieces = plan(0, trace.half_cycles, points, MARGIN, MOST_STEPS, LEAST_FOLD)
        before: Values | None = None
        for piece in pieces:
            within = [r for r in trace.rests if piece.begins <= r.half_cycle < piece.ends]
            if piece.folded:
                said = f"half-cycles {piece.begins} to {piece.ends - 1}:{fold_text(piece.length, UNICODE)}"
                yield self._step(said.rstrip(), before or {}, [], "unimportant")
                before = _of_rest(within[-1]) if within else before
                continue
            for rest in within:
                when = f"half-cycle {rest.half_cycle}" + (", inputs" if rest.moved else "")
                marked = rest.half_cycle in (trace.begins, trace.ends)
                yield self._moved(when, before, _of_rest(rest), "essential" if marked else "important")
                before = _of_rest(rest)

    def _micro_steps(self, unsettled: Unsettled) -> Iterator[Object]:
        before: Values | None = None
        for count, state in enumerate(unsettled.cycle[:MOST_STEPS]):
            values = self.report.rhythm.system.describe(state)
            yield self._moved(f"micro-step {count}", before, values, "essential")
            before = values
        yield self._step("and again from micro-step 0", before or {}, [], "important")

    def _arrivals(self, glitch: Glitch) -> Iterator[Object]:
        before: Values = {n: v for n, v in glitch.state.items() if n in glitch.arrivals[0].seen}
        output = self.report.ports.output
        for count, arrival in enumerate(glitch.arrivals[:MOST_STEPS]):
            moved = [n for n, v in arrival.seen.items() if before.get(n, v) != v]
            said = f"{arrival.name} {arrival.old}→{arrival.new} arrives: {output}={arrival.level}"
            importance = "essential" if count == glitch.first else "important"
            yield self._step(said, {**arrival.seen, output: arrival.level}, moved, importance)
            before = dict(arrival.seen)

    def _moved(self, when: str, before: Values | None, values: Values, importance: str) -> Object:
        """A step with what changed in it."""
        moved = list(values) if before is None else [n for n, v in values.items() if before.get(n) != v]
        said = ", ".join(f"{name}={values[name]}" for name in moved[:MOST_VALUES]) or "nothing changes"
        more = ", …" if len(moved) > MOST_VALUES else ""
        return self._step(f"{when}: {said}{more}", values, moved if before is not None else [], importance)

    def _step(self, said: str, values: Values, moved: Sequence[str], importance: str) -> Object:
        where = self._register(moved) or self._output()
        shown = list(values)[: MOST_VALUES - 1] + list(values)[MOST_VALUES - 1 :][-1:]
        return {
            "location": self.log.location(where, said, context=False),
            "state": {name: {"text": str(values[name])} for name in shown},
            "importance": importance,
        }


def _code_flow(said: str, cause: str, steps: list[Object]) -> Object:
    for number, step in enumerate(steps):
        step["executionOrder"] = number
    return {
        "message": message(said),
        "threadFlows": [{"message": message(f"start: {cause}"), "locations": steps}],
    }


def _of_rest(rest: Rest) -> Values:
    return {**rest.registers, **rest.inputs, **{f"output {n}": v for n, v in rest.outputs.items()}}


def _moving(rows: Sequence[Values]) -> list[str]:
    """The names whose values differ among the rows."""
    return [name for name in (rows[0] if rows else {}) if len({row[name] for row in rows}) > 1]
