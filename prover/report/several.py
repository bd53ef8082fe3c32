"""Several dividers in one run: a line for each at the end, and one object for machines.

Schema "subharmonic/reports-1": `reports` are whole reports, `errors` what kept a divider from having one.
"""

from __future__ import annotations

from collections import Counter
from collections.abc import Sequence
from json import dumps

from prover.errors import UserError
from prover.findings import Report
from prover.output import harmless
from prover.report.json import Object, as_object
from prover.report.look import Look, finished
from prover.several import Outcome

SCHEMA = "subharmonic/reports-1"


def render_json(found: Sequence[Outcome], more: Object | None = None) -> str:
    """All outcomes as JSON text, one object, ended by a newline; `more` are entries that it has besides."""
    told: Object = {
        "schema": SCHEMA,
        "reports": [as_object(outcome.report) for outcome in found if outcome.report is not None],
        "errors": [_error(outcome) for outcome in found if outcome.report is None],
        **(more or {}),
    }
    return dumps(told, indent=2) + "\n"


def _error(outcome: Outcome) -> Object:
    error = outcome.error or UserError(outcome.fault or outcome.open)
    return {
        "files": list(outcome.files),
        "kind": "error" if outcome.error else "fault" if outcome.fault else "open",
        "message": error.message,
        "file": error.where.file if error.where else None,
        "line": error.where.line if error.where else None,
        "hint": error.hint,
    }


def word(outcome: Outcome) -> str:
    """What came of a divider, in one word."""
    if outcome.report is not None:
        return outcome.report.verdict.upper() if outcome.report.findings else "MEASURED"
    return "ERROR" if outcome.error else "FAULT" if outcome.fault else "OPEN"


def summary(found: Sequence[Outcome], look: Look) -> str:
    """A line for each divider and one for all, for people."""
    rows = [(word(o), o.name, _with_top(o)) for o in found]
    widest = max(len(harmless(name)) for _, name, _ in rows)
    lines = [f"{len(found)} divider{'s' * (len(found) != 1)}"]
    lines += [f"{verdict:8}  {harmless(name):{widest}}  {says}".rstrip() for verdict, name, says in rows]
    counted = Counter(verdict.lower() for verdict, _, _ in rows)
    return finished([*lines, ", ".join(f"{count} {what}" for what, count in counted.items())], look)


def _with_top(outcome: Outcome) -> str:
    tops = [outcome.report.ports.design.top] if outcome.report else []
    return ": ".join(part for part in (*tops, says(outcome)) if part)


def says(outcome: Outcome) -> str:
    """What is wrong with the divider, or what was measured."""
    report = outcome.report
    if report is None:
        where = outcome.error.where if outcome.error else None
        text = outcome.error.message if outcome.error else outcome.fault or outcome.open
        return (f"line {where.line}: " if where and where.file == outcome.name else "") + text
    if report.findings:
        wrong = [f.name for f in report.findings if f.verdict == report.verdict and f.waived is None]
        return ", ".join(wrong) if report.verdict != "proved" else ""
    return _measured(report)


def _measured(report: Report) -> str:
    rhythm = report.rhythm
    waves = [orbit.wave() for orbit in rhythm.orbits] or [loop.wave for loop in rhythm.loops]
    told = {
        "never settles"
        if wave is None
        else "stuck"
        if wave.stuck
        else f"period {wave.period}, high {wave.high}"
        for wave in waves
    }
    return " or ".join(sorted(told)) if told else rhythm.open or "nothing known"
